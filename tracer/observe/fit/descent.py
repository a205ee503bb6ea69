"""The least sum of squares within bounds: damped Gauss-Newton steps from the valleys of a grid of starts."""

import itertools
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import minimum_filter
from scipy.optimize import nnls

from tracer.observe.fit.likelihood import Likelihood

Floats = NDArray[np.float64]
Truths = NDArray[np.bool_]

MOST_STEPS = 400
SMALLEST_GAIN = 1e-9
"""Fall of -2 ln L, of order 1 over a standard error, below which a descent has arrived."""
FIRST_DAMPING, LEAST_DAMPING, MOST_DAMPING = 1e-4, 1e-12, 1e12
STARTS_PER_PARAMETER = {0: 1, 1: 25, 2: 11, 3: 7}
FEWEST_STARTS = 4
MOST_DESCENTS = 9
"""Most descents from different starts: the lowest of those points of the grid that no neighbour is below."""
SAME_PLACE = 1e-2
"""Distance between the ends of two descents, in any parameter, below which they lie in one valley."""
BOUNDED_STEPS = 3
"""Turns over all rates by which those of a start are brought within their bounds."""


class Valley(NamedTuple):
    """A minimum of -2 ln L: its parameters and `value`."""

    parameters: Floats
    value: float


def descend(
    likelihood: Likelihood,
    starts: Floats,
    held: Truths,
    values: Floats | None = None,
    smallest_gain: float = SMALLEST_GAIN,
) -> tuple[Floats, Floats]:
    """Return the parameters (D, P) of least -2 ln L near each start, and these values (D,).

    Levenberg-Marquardt steps (Marquardt 1963, J. SIAM 11, 431: memory), of all side by side; one that would leave the
    bounds ends on them, and a parameter on a bound takes part again only where the slope leads inside.

    Parameters
    ----------
    likelihood : Likelihood
        What falls.
    starts : ndarray, shape (D, P)
        Where each descent begins.
    held : ndarray of bool, shape (P,)
        Parameters that stay.
    values : ndarray, shape (D, N), optional
        A profile for each, in place of the measured one.
    smallest_gain : float, optional
        Fall of -2 ln L, of order 1 over a standard error, below which a descent has arrived.
    """
    low, high = likelihood.low, likelihood.high
    at = np.clip(starts, low, high)
    residual, slope = likelihood.residuals(at, values)
    value = np.vecdot(residual, residual)
    damping = np.full(len(at), FIRST_DAMPING)
    going = np.arange(len(at))
    for _ in range(MOST_STEPS):
        if not len(going):
            break
        trial = at[going] + _steps(residual[going], slope[going], damping[going], at[going], likelihood, held)
        trial = np.minimum(np.maximum(trial, low), high)
        new, new_slope = likelihood.residuals(trial, None if values is None else values[going])
        new_value = np.vecdot(new, new)
        gain = value[going] - new_value
        good = gain >= 0.0
        done = going[good]
        at[done], residual[done], slope[done], value[done] = (
            part[good] for part in (trial, new, new_slope, new_value)
        )
        before = damping[going]
        damping[going] = np.where(good, np.maximum(LEAST_DAMPING, 0.1 * before), 8.0 * before)
        going = going[
            np.where(good, gain > smallest_gain * (1.0 + 1e-3 * new_value), damping[going] < MOST_DAMPING)
        ]
    return at, value


def valleys(likelihood: Likelihood, starts: Sequence[Floats]) -> tuple[Valley, ...]:
    """Return the minima of -2 ln L to which the starts lead, the lowest first."""
    held = np.zeros(len(likelihood.slots), dtype=bool)
    found = [
        Valley(at, float(value))
        for at, value in zip(*descend(likelihood, np.array(starts), held), strict=True)
    ]
    kept: list[Valley] = []
    for one in sorted(found, key=lambda valley: valley.value):
        if all(np.max(np.abs(one.parameters - other.parameters)) > SAME_PLACE for other in kept):
            kept.append(one)
    return tuple(kept)


def _steps(
    residual: Floats, slope: Floats, damping: Floats, at: Floats, likelihood: Likelihood, held: Truths
) -> Floats:
    """Return a step (D, P) for each; parameters held, or on a bound that stops them, stay."""
    gradient = (slope @ residual[:, :, np.newaxis])[:, :, 0]
    free = (
        ~held & ~((at <= likelihood.low) & (gradient > 0.0)) & ~((at >= likelihood.high) & (gradient < 0.0))
    )
    slope = slope * free[:, :, np.newaxis]
    normal = slope @ slope.transpose(0, 2, 1)
    places = np.arange(at.shape[1])
    scale = np.sqrt(np.maximum(normal[:, places, places], np.finfo(float).tiny))
    scaled = normal / (scale[:, :, np.newaxis] * scale[:, np.newaxis, :])
    # A part of the trace as well: two parameters that do the same leave a matrix without inverse.
    scaled[:, places, places] = 1.0 + damping[:, np.newaxis] + 1e-13
    moved = np.linalg.solve(scaled, (-gradient * free / scale)[:, :, np.newaxis])[:, :, 0] / scale
    return np.where(free, moved, 0.0)


def suited(likelihood: Likelihood, values: Floats, held: Truths, at: Floats) -> Floats:
    """Return for each profile (D, N) the parameters (D, P) of least -2 ln L on a grid over the laws' parameters.

    Rates and background have the values that suit the law parameters, near enough to start from. Parameters `held` (P,)
    stay as in `at` (P,). Upper limits there must be none.
    """
    laws = [n for n, slot in enumerate(likelihood.slots) if slot.key is not None and not held[n]]
    linear = [n for n, slot in enumerate(likelihood.slots) if slot.key is None and not held[n]]
    grid = np.tile(at, (STARTS_PER_PARAMETER.get(len(laws), FEWEST_STARTS) ** len(laws), 1))
    grid[:, laws] = _grid(likelihood, laws)
    grid[:, linear] = 0.0
    empty, slopes = likelihood.residuals(grid, np.zeros(values.shape[1]))
    seen = likelihood.residuals(np.broadcast_to(grid[0], (len(values), len(at))), values)[0]
    shift = empty - empty[0]
    columns = -slopes[:, linear]
    normal = columns @ columns.transpose(0, 2, 1)
    asked = columns @ seen.T + np.vecdot(columns, shift[:, np.newaxis])[:, :, np.newaxis]
    chosen = _bounded(normal, asked, likelihood.low[linear])
    fallen = np.sum((2.0 * asked - normal @ chosen) * chosen, axis=1)
    value = 2.0 * shift @ seen.T + np.vecdot(shift, shift)[:, np.newaxis] - fallen
    lowest = np.argmin(value, axis=0)
    starts: Floats = grid[lowest]
    starts[:, linear] = chosen[lowest, :, np.arange(len(values))]
    return starts


def _bounded(normal: Floats, asked: Floats, low: Floats) -> Floats:
    """Return x (G, R, D) near the least of x^T M x - 2 b^T x above `low` (R,), for M (G, R, R) and b (G, R, D).

    Gauss-Seidel steps from the least without bounds: each takes one of x to its best, or to its bound.
    """
    x = np.maximum(np.linalg.pinv(normal, hermitian=True) @ asked, low[:, np.newaxis])
    for _ in range(BOUNDED_STEPS):
        for n in range(len(low)):
            size = np.maximum(normal[:, n, n, np.newaxis], np.finfo(float).tiny)
            left = asked[:, n] - (normal[:, n, np.newaxis] @ x)[:, 0]
            x[:, n] = np.maximum(x[:, n] + left / size, low[n])
    return x


def _grid(likelihood: Likelihood, places: Sequence[int]) -> Floats:
    """Return the points of a grid over the parameters at these places."""
    count = STARTS_PER_PARAMETER.get(len(places), FEWEST_STARTS)
    axes = [
        likelihood.low[n] + (likelihood.high[n] - likelihood.low[n]) * (np.arange(count) + 0.5) / count
        for n in places
    ]
    return np.array(list(itertools.product(*axes)))


def grid_starts(likelihood: Likelihood) -> list[Floats]:
    """Return the valleys of a grid over the laws' parameters, each with the rates that suit it, the lowest first."""
    places = [n for n, slot in enumerate(likelihood.slots) if slot.key is not None]
    count = STARTS_PER_PARAMETER.get(len(places), FEWEST_STARTS)
    starts = np.zeros((count ** len(places), len(likelihood.slots)))
    starts[:, places] = _grid(likelihood, places)
    starts = _linear(likelihood, starts)
    residual, _ = likelihood.residuals(starts)
    values = np.vecdot(residual, residual)
    if places:
        grid = values.reshape([count] * len(places))
        lowest = np.flatnonzero(grid <= minimum_filter(grid, size=3, mode="nearest"))
    else:
        lowest = np.zeros(1, dtype=int)
    order = lowest[np.argsort(values[lowest], kind="stable")]
    return [starts[n] for n in order[:MOST_DESCENTS]]


def _linear(likelihood: Likelihood, starts: Floats) -> Floats:
    """Return starts (S, P) with rates and background that suit their law parameters, by non-negative least squares.

    Lawson & Hanson 1974, Solving Least Squares Problems, chapter 23 (memory). A background of either sign is the
    difference of two columns. Upper limits do not count here.
    """
    places = [n for n, slot in enumerate(likelihood.slots) if slot.key is None]
    starts = starts.copy()
    starts[:, places] = 0.0
    if not places:
        return starts
    measured = int((~likelihood.data.upper).sum())
    residuals, slopes = (part[..., :measured] for part in likelihood.residuals(starts))
    signed = [k for k, n in enumerate(places) if likelihood.slots[n].low < 0.0]
    for start, residual, slope in zip(starts, residuals, slopes, strict=True):
        # Slopes of the rates do not depend on the rates.
        columns = -slope[places].T
        solution = nnls(np.hstack([columns, -columns[:, signed]]), residual)[0]
        chosen = solution[: len(places)]
        chosen[signed] -= solution[len(places) :]
        start[places] = chosen
    return starts
