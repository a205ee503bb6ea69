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

MOST_STEPS = 200
SMALLEST_GAIN = 1e-9
"""Fall of -2 ln L, of order 1 over a standard error, below which a descent has arrived."""
FIRST_DAMPING, LEAST_DAMPING, MOST_DAMPING = 1e-4, 1e-12, 1e12
STARTS_PER_PARAMETER = {0: 1, 1: 25, 2: 11, 3: 7}
FEWEST_STARTS = 4
MOST_DESCENTS = 9
"""Most descents from different starts: the lowest of those points of the grid that no neighbour is below."""
SAME_PLACE = 1e-2
"""Distance between the ends of two descents, in any parameter, below which they lie in one valley."""


class Valley(NamedTuple):
    """A minimum of -2 ln L: its parameters and `value`."""

    parameters: Floats
    value: float


def descend(likelihood: Likelihood, start: Floats, held: Truths) -> tuple[Floats, float]:
    """Return the parameters of least -2 ln L near `start`, and that value; parameters `held` stay.

    Levenberg-Marquardt steps (Marquardt 1963, J. SIAM 11, 431: memory); one that would leave the bounds ends on them,
    and a parameter on a bound takes part again only where the slope leads inside.
    """
    low, high = likelihood.low, likelihood.high
    at = np.clip(start, low, high)
    residual, slope = likelihood.residuals(at)
    value, damping = float(residual @ residual), FIRST_DAMPING
    for _ in range(MOST_STEPS):
        gradient = slope.T @ residual
        free = ~held & ~((at <= low) & (gradient > 0.0)) & ~((at >= high) & (gradient < 0.0))
        if not free.any():
            break
        normal = slope[:, free].T @ slope[:, free]
        found = False
        while damping < MOST_DAMPING:
            trial = at.copy()
            trial[free] += _step(normal, gradient[free], damping)
            trial = np.clip(trial, low, high)
            new, new_slope = likelihood.residuals(trial)
            new_value = float(new @ new)
            if new_value <= value:
                found = True
                break
            damping *= 8.0
        if not found:
            break
        gain = value - new_value
        at, residual, slope, value = trial, new, new_slope, new_value
        damping = max(LEAST_DAMPING, damping / 10.0)
        if gain < SMALLEST_GAIN * (1.0 + 1e-3 * value):
            break
    return at, value


def valleys(likelihood: Likelihood, starts: Sequence[Floats]) -> tuple[Valley, ...]:
    """Return the minima of -2 ln L to which the starts lead, the lowest first."""
    held = np.zeros(len(likelihood.slots), dtype=bool)
    found = [Valley(*descend(likelihood, start, held)) for start in starts]
    kept: list[Valley] = []
    for one in sorted(found, key=lambda valley: valley.value):
        if all(np.max(np.abs(one.parameters - other.parameters)) > SAME_PLACE for other in kept):
            kept.append(one)
    return tuple(kept)


def _step(normal: Floats, gradient: Floats, damping: float) -> Floats:
    scale = np.sqrt(np.maximum(np.diag(normal), np.finfo(float).tiny))
    scaled = normal / np.outer(scale, scale)
    # A part of the trace as well: two parameters that do the same leave a matrix without inverse.
    scaled.flat[:: len(scale) + 1] += damping + 1e-13
    return np.asarray(np.linalg.solve(scaled, -gradient / scale) / scale)


def grid_starts(likelihood: Likelihood) -> list[Floats]:
    """Return the valleys of a grid over the laws' parameters, each with the rates that suit it, the lowest first."""
    places = [n for n, slot in enumerate(likelihood.slots) if slot.key is not None]
    count = STARTS_PER_PARAMETER.get(len(places), FEWEST_STARTS)
    axes = [
        likelihood.low[n] + (likelihood.high[n] - likelihood.low[n]) * (np.arange(count) + 0.5) / count
        for n in places
    ]
    starts = []
    for logs in itertools.product(*axes):
        start = np.zeros(len(likelihood.slots))
        start[places] = logs
        starts.append(_linear(likelihood, start))
    values = np.array([likelihood.value(start) for start in starts])
    if places:
        grid = values.reshape([count] * len(places))
        lowest = np.flatnonzero(grid <= minimum_filter(grid, size=3, mode="nearest"))
    else:
        lowest = np.zeros(1, dtype=int)
    order = lowest[np.argsort(values[lowest], kind="stable")]
    return [starts[n] for n in order[:MOST_DESCENTS]]


def _linear(likelihood: Likelihood, start: Floats) -> Floats:
    """Return the start with rates and background that suit its law parameters, by non-negative least squares.

    Lawson & Hanson 1974, Solving Least Squares Problems, chapter 23 (memory). A background of either sign is the
    difference of two columns. Upper limits do not count here.
    """
    places = [n for n, slot in enumerate(likelihood.slots) if slot.key is None]
    start = start.copy()
    start[places] = 0.0
    if not places:
        return start
    measured = int((~likelihood.data.upper).sum())
    residual, slope = (part[:measured] for part in likelihood.residuals(start))
    # Slopes of the rates do not depend on the rates.
    columns = -slope[:, places]
    signed = [k for k, n in enumerate(places) if likelihood.slots[n].low < 0.0]
    solution = nnls(np.hstack([columns, -columns[:, signed]]), residual)[0]
    chosen = solution[: len(places)]
    chosen[signed] -= solution[len(places) :]
    start[places] = chosen
    return start
