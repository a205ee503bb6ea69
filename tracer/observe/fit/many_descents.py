"""The descent of `descent.descend` for many profiles at once, each from its own start."""

import numpy as np
from numpy.typing import NDArray

from tracer.observe.fit.descent import FIRST_DAMPING, LEAST_DAMPING, MOST_DAMPING
from tracer.observe.fit.likelihood import Likelihood

Floats = NDArray[np.float64]
Truths = NDArray[np.bool_]

MOST_STEPS = 100
SMALLEST_GAIN = 1e-4
"""Fall of -2 ln L below which a descent has arrived: what is asked of many is how rises of order 1 are distributed,
which 1e-8 leaves the same to three digits."""


def descend_many(
    likelihood: Likelihood, values: Floats, starts: Floats, held: Truths
) -> tuple[Floats, Floats]:
    """Return the parameters (D, P) of least -2 ln L near each start, and these values (D,).

    Parameters
    ----------
    likelihood : Likelihood
        Without upper limits.
    values : ndarray, shape (D, N)
        The profiles, in place of the measured one.
    starts : ndarray, shape (D, P)
        Where each descent begins.
    held : ndarray of bool, shape (P,)
        Parameters that stay.
    """
    low, high = likelihood.low, likelihood.high
    at = np.clip(starts, low, high)
    residual, slope = likelihood.residuals_of_many(values, at)
    value = np.sum(residual**2, axis=1)
    damping = np.full(len(at), FIRST_DAMPING)
    going = np.arange(len(at))
    for _ in range(MOST_STEPS):
        if not len(going):
            break
        trial = np.clip(
            at[going] + _steps(residual[going], slope[going], damping[going], at[going], likelihood, held),
            low,
            high,
        )
        new, new_slope = likelihood.residuals_of_many(values[going], trial)
        new_value = np.sum(new**2, axis=1)
        gain = value[going] - new_value
        good = gain >= 0.0
        done = going[good]
        at[done], residual[done], slope[done], value[done] = (
            part[good] for part in (trial, new, new_slope, new_value)
        )
        damping[going] = np.where(
            good, np.maximum(LEAST_DAMPING, damping[going] / 10.0), 8.0 * damping[going]
        )
        going = going[np.where(good, gain > SMALLEST_GAIN, damping[going] < MOST_DAMPING)]
    return at, value


def _steps(
    residual: Floats, slope: Floats, damping: Floats, at: Floats, likelihood: Likelihood, held: Truths
) -> Floats:
    """Return a Levenberg-Marquardt step for each; parameters held, or on a bound that stops them, stay."""
    gradient = np.einsum("dpn,dn->dp", slope, residual)
    free = (
        ~held & ~((at <= likelihood.low) & (gradient > 0.0)) & ~((at >= likelihood.high) & (gradient < 0.0))
    )
    slope = slope * free[:, :, None]
    normal = slope @ slope.transpose(0, 2, 1)
    scale = np.sqrt(np.maximum(np.einsum("dpp->dp", normal), np.finfo(float).tiny))
    scaled = normal / (scale[:, :, None] * scale[:, None, :])
    places = np.arange(at.shape[1])
    scaled[:, places, places] = 1.0 + damping[:, None] + 1e-13
    moved = np.linalg.solve(scaled, (-gradient * free / scale)[:, :, None])[:, :, 0] / scale
    return np.where(free, moved, 0.0)
