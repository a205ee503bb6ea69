"""The run of a quantity inside a cell: exponential in altitude, with the cell's mean kept.

In cell i it is q_i norm exp(-k (r - middle)), its mean over the cell's volume q_i. The decay k comes from the cells
above and below: the slope, at the cell's middle, of the parabola through the logarithms of the three values at the
middles. Those values are themselves means divided by what an exponential's mean is over its value in the middle, so
that a few rounds find an exponential exactly. Where a neighbour holds nothing the other side alone decides; where both
hold nothing the quantity is constant.
"""

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

ROUNDS = 4
STEEPEST = 4.0
"""Largest |decay| times thickness: between neighbours of a few atoms a steeper run would be noise."""
POINTS = 8
"""Gauss-Legendre points over a cell; for decay times thickness of at most `STEEPEST` exact to 1e-10."""


def reconstruct(means: Floats, radii: Floats) -> tuple[Floats, Floats]:
    """Return (norms, decays [m-1]) of a quantity with the given cell means.

    Parameters
    ----------
    means : ndarray, shape (A, ...)
        Means over the cells' volumes, none negative; altitude is the first axis.
    radii : ndarray, shape (A + 1,)
        Edges of the cells from the centre [m].
    """
    decays = np.zeros_like(means)
    if len(means) < 2:
        return np.ones_like(means), decays
    thickness = np.diff(radii).reshape(-1, *[1] * (means.ndim - 1))
    middles = 0.5 * (radii[:-1] + radii[1:])
    for _ in range(ROUNDS):
        values = means * _norms(decays, radii)
        decays = np.clip(-_slopes(values, middles) * thickness, -STEEPEST, STEEPEST) / thickness
    return _norms(decays, radii), decays


def _norms(decays: Floats, radii: Floats) -> Floats:
    """Return the value at the middle over the mean over the volume, of exponentials with the given decays."""
    nodes, weights = np.polynomial.legendre.leggauss(POINTS)
    shape = (-1, *[1] * (decays.ndim - 1))
    half, middle = 0.5 * np.diff(radii), 0.5 * (radii[:-1] + radii[1:])
    content, volume = np.zeros_like(decays), np.zeros(len(half))
    for node, weight in zip(nodes, weights, strict=True):
        part = weight * (middle + node * half) ** 2
        volume += part
        content += part.reshape(shape) * np.exp(-decays * (node * half).reshape(shape))
    return np.asarray(volume.reshape(shape) / content)


def _slopes(values: Floats, middles: Floats) -> Floats:
    """Return the slopes of log(values) at the middles; 0 where a cell or both its neighbours hold nothing."""
    held = values > 0.0
    logs = np.log(np.where(held, values, 1.0))
    steps = np.diff(middles).reshape(-1, *[1] * (values.ndim - 1))
    known = held[1:] & held[:-1]
    between = np.where(known, np.diff(logs, axis=0) / steps, 0.0)
    # A parabola weighs the slope of each side with the distance to the other side's middle.
    below, above = np.zeros_like(values), np.zeros_like(values)
    slopes = np.zeros_like(values)
    below[1:], above[:-1] = known, known
    both = (below[1:-1] > 0.0) & (above[1:-1] > 0.0)
    below[1:-1] *= np.where(both, np.broadcast_to(steps[1:], both.shape), 1.0)
    above[1:-1] *= np.where(both, np.broadcast_to(steps[:-1], both.shape), 1.0)
    slopes[1:] += below[1:] * between
    slopes[:-1] += above[:-1] * between
    total = below + above
    return np.asarray(np.divide(slopes, total, out=np.zeros_like(values), where=total > 0.0))
