"""By how much -2 ln L may rise at a parameter's true value: measured on profiles drawn anew about the best fit.

Where parameters can stand in for one another and are poorly known, -2 ln L is no parabola within their ranges, and its
rise at the truth is not distributed as chi-square with one degree of freedom (Wilks 1938), which holds in the limit of
small errors alone. Its distribution is then taken from a parametric bootstrap (Efron & Tibshirani 1993, An Introduction
to the Bootstrap, section 6.5; of likelihood ratios: Davison & Hinkley 1997, Bootstrap Methods and their Application,
section 4.2; both memory): profiles are drawn about the best fit with the errors of measurement and model, each is
fitted, and the rise at the parameter with which it was drawn is noted.

Two means make few draws do. Their errors are the points of a scrambled Sobol sequence (Sobol' 1967, USSR Comput. Math.
Math. Phys. 7, 86; Owen 1998, ACM Trans. Model. Comput. Simul. 8, 71; both memory), whose first directions, the most
even ones, are those in which the free parameters move the profile: rises depend on these above all. And the same errors
in the fit made linear about the best give a rise that is exactly chi-square: the draws need only tell by how much the
shares of the two differ (control variate: Hesterberg 1996, Stat. and Computing 6, 147: memory). Where the fit is linear
the two are the same number, and the rises those of Wilks.
"""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammainc, ndtr, ndtri
from scipy.stats import qmc

from tracer.observe.fit.descent import descend
from tracer.observe.fit.likelihood import Likelihood
from tracer.observe.fit.ranges import RISE_68, RISE_95, Scan, other_starts

Floats = NDArray[np.float64]

DRAWS = 512
"""A power of two, for which the sequence is even: a second or less of one core with two releases."""
SMALLEST_SHARE = 2.0**-31
"""Half the step of the sequence."""
SEED = 20310930
MOST_POINTS = 500
"""Points of a profile above which its draws take too long: 0.4 s of one core with 36, 4 s with 288, four parameters."""
LARGEST_ROOT, ROOTS = 4.0, 200
"""Rises are looked for at this many square roots, up to that of 16."""
SMALLEST_GAIN = 1e-4
"""Fall of -2 ln L below which the descent of a draw has arrived: what is asked of many is how rises of order 1 are
distributed, which 1e-8 leaves the same to three digits."""
BLUR = 0.2
"""Width, in the square root, with which draws are counted: alike in both shares, so that it cancels but for what
differs. Rises of the hard case of analysis/validation/fit-coverage then scatter by 0.03 (68 %) and 0.15 (95 %) from
one seed to another; with as many independent errors, in pairs of opposite sign, by 0.06 and 0.3. The seed being one for
all fits, what it has of that does not average out over many."""


class Calibration(NamedTuple):
    """Rises of -2 ln L at the ends of the ranges of 68.27 and 95 % of each parameter (P, 2), from so many `draws`.

    Without draws the rises are those of Wilks, and `reason` says why.
    """

    rises: Floats
    draws: int
    reason: str


def calibrated(scan: Scan) -> Calibration:
    """Return the rises at the ends of ranges; those of Wilks for a parameter on an edge of what is allowed."""
    rises = np.tile([RISE_68, RISE_95], (len(scan.best), 1))
    reason = _reason(scan)
    if reason:
        return Calibration(rises, 0, reason)
    known = np.flatnonzero(np.diag(scan.covariance) > 0.0)
    drawn, linear = _drawn(scan, known)
    for n, one, other in zip(known, drawn.T, linear.T, strict=True):
        rises[n] = quantiles(one, other)
    return Calibration(rises, DRAWS, "")


def _reason(scan: Scan) -> str:
    """Return why rises are not to be drawn; nothing where they are."""
    several = max((len(one.curve.parameters) for one in scan.likelihood.components), default=0)
    if not several:
        return "all that is free enters linearly, for which they are exact"
    if scan.likelihood.data.upper.any():
        return "in another draw an upper limit would be a measurement"
    if len(scan.likelihood.data.value) > MOST_POINTS:
        return (
            f"profiles of more than {MOST_POINTS} points take too long to be fitted again hundreds of times"
        )
    if several > 1:
        return "a law with several free parameters takes too long to be fitted again hundreds of times"
    return ""


def quantiles(rises: Floats, linear: Floats) -> tuple[float, float]:
    """Return what 68.27 and 95 % of rises stay below, at least what Wilks has.

    A range is never made narrower than that of the likelihood ratio: rises that are held down by an edge of what is
    allowed, near the best fit, need not be so near the truth.

    Parameters
    ----------
    rises, linear : ndarray, shape (D,)
        Rises of -2 ln L, and what the same errors give in the fit made linear, which is distributed as chi-square with
        one degree of freedom.
    """
    roots = np.linspace(0.0, LARGEST_ROOT, ROOTS + 1)[1:]
    places = roots**2
    below, due = (
        np.mean(ndtr((roots - np.sqrt(np.maximum(one, 0.0))[:, None]) / BLUR), axis=0)
        for one in (rises, linear)
    )
    # Sorted, since a share that falls is scatter (rearrangement: Chernozhukov et al. 2009, Biometrika 96, 559: memory).
    shares = np.sort(gammainc(0.5, 0.5 * places) + below - due)
    wilks = np.array([RISE_68, RISE_95])
    low, high = np.maximum(np.interp(gammainc(0.5, 0.5 * wilks), shares, places), wilks)
    return float(low), float(high)


def _drawn(scan: Scan, wanted: NDArray[np.int64]) -> tuple[Floats, Floats]:
    """Return rises (D, W) of the wanted parameters, and those of the fit made linear about the best."""
    likelihood, best = scan.likelihood, scan.best
    slope = likelihood.residuals(best)[1]
    normal = _normal(slope)
    values = likelihood.model(best).total + likelihood.noise(normal)
    shift = normal @ slope[wanted].T @ scan.covariance[np.ix_(wanted, wanted)]
    linear = shift**2 / np.diag(scan.covariance)[wanted]
    held = np.zeros(len(best), dtype=bool)
    starts = [best, *(one.parameters for one in scan.valleys[1:]), *other_starts(scan, best, held)]
    at, least = lowest(scan.likelihood, values, starts, held)
    rises = np.empty((len(values), len(wanted)))
    for k, n in enumerate(wanted):
        held[:] = False
        held[n] = True
        near = at.copy()
        near[:, n] = best[n]
        rises[:, k] = lowest(scan.likelihood, values, [near, best], held)[1] - least
    return rises, linear


def _normal(slope: Floats) -> Floats:
    """Return standard normal numbers (D, N), the most even ones along the slopes (P, N) of the residuals."""
    even = qmc.Sobol(slope.shape[1], seed=np.random.default_rng(SEED)).random(DRAWS)
    directions = np.linalg.qr(slope.T, mode="complete")[0]
    return np.asarray(ndtri(np.maximum(even, SMALLEST_SHARE)) @ directions.T)


def lowest(
    likelihood: Likelihood, values: Floats, starts: Sequence[Floats], held: NDArray[np.bool_]
) -> tuple[Floats, Floats]:
    """Return the best parameters (D, P) of descents from several starts, and their -2 ln L (D,).

    Each profile of `values` (D, N) is fitted from each start, (P,) or (D, P); parameters `held` (P,) stay.
    """
    count = len(values)
    every = np.concatenate([np.broadcast_to(start, (count, len(held))) for start in starts])
    at, value = descend(likelihood, every, held, np.tile(values, (len(starts), 1)), SMALLEST_GAIN)
    value = value.reshape(len(starts), count)
    chosen = np.argmin(value, axis=0), np.arange(count)
    return at.reshape(len(starts), count, -1)[chosen], value[chosen]
