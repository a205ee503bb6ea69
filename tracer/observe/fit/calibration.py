"""By how much -2 ln L may rise at the end of a range: measured on profiles drawn anew about that end.

Where parameters can stand in for one another and are poorly known, -2 ln L is no parabola within their ranges, and its
rise at the truth is not distributed as chi-square with one degree of freedom (Wilks 1938), which holds in the limit of
small errors alone. A value belongs to a range if, were it the true one, -2 ln L would rise at it by as much as here in
more than 32 or 5 % of measurements (Neyman 1937, Phil. Trans. R. Soc. A 236, 333; ordered by the likelihood ratio:
Feldman & Cousins 1998, Phys. Rev. D 57, 3873; all else at its best for that value: Chuang & Lai 2000, Statistica Sinica
10, 1; all memory). So at each end that 1 and 3.84 give, profiles are drawn with the errors of measurement and model
about the fit that is best there, each is fitted with the parameter free and held, and the range ends where the rise is
that which 68.27 and 95 % of theirs stay below. Draws about the best fit instead (Efron & Tibshirani 1993, An
Introduction to the Bootstrap, section 6.5: memory) ask about a value that is not at stake: near an edge of what is
allowed their rises are held down, where those at the end need not be, and the other way about.

Two means make few draws do. Their errors are the points of a scrambled Sobol sequence (Sobol' 1967, USSR Comput. Math.
Math. Phys. 7, 86; Owen 1998, ACM Trans. Model. Comput. Simul. 8, 71; both memory), whose first directions, the most
even ones, are those in which the free parameters move the profile: rises depend on these above all. And the same errors
in the fit made linear about the end give a rise that is exactly chi-square: the draws need only tell by how much the
shares of the two differ (control variate: Hesterberg 1996, Stat. and Computing 6, 147: memory). Where the fit is linear
the two are the same number, and the rises those of Wilks.
"""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammainc, ndtr, ndtri
from scipy.stats import qmc

from tracer.observe.fit.descent import Valley, descend, suited
from tracer.observe.fit.likelihood import Likelihood
from tracer.observe.fit.ranges import RISE_68, RISE_95, End, Scan, end_of, scan_of

Floats = NDArray[np.float64]

DRAWS = 256
"""At each end. A power of two, for which the sequence is even: a tenth of a second of one core with two releases."""
SMALLEST_SHARE = 2.0**-31
"""Half the step of the sequence."""
SEED = 20310930
MOST_POINTS = 500
"""Points of a profile above which its draws take too long: 3 s of one core with 36, 15 s with 288, four parameters."""
LARGEST_ROOT, ROOTS = 4.0, 200
"""Rises are looked for at this many square roots, up to that of 16."""
SMALLEST_GAIN = 1e-4
"""Fall of -2 ln L below which the descent of a draw has arrived: what is asked of many is how rises of order 1 are
distributed, which 1e-8 leaves the same to three digits."""
BLUR = 0.2
"""Width, in the square root, with which draws are counted: alike in both shares, so that it cancels but for what
differs. Rises of the hard case of analysis/validation/fit-coverage then scatter by 0.05 (68 %) and 0.2 (95 %) from
one seed to another; 512 draws leave two thirds of that and cost a quarter more time. The seed being one for all fits,
what it has of that does not average out over many."""


class Calibration(NamedTuple):
    """Rises of -2 ln L at the ends of ranges (P, 2, 2): of each parameter, of 68.27 and 95 %, lower and upper.

    They come from so many `draws` about each end. Without draws they are those of Wilks, and `reason` says why.
    """

    rises: Floats
    draws: int
    reason: str


def calibrated(scan: Scan) -> Calibration:
    """Return the rises at the ends of ranges; those of Wilks at an end that the edge of what is allowed cuts short.

    Raises
    ------
    BetterFound
        With parameters that are more likely than the best known.
    """
    rises = np.empty((len(scan.best), 2, 2))
    rises[:] = np.array([RISE_68, RISE_95])[:, np.newaxis]
    reason = _reason(scan)
    if reason:
        return Calibration(rises, 0, reason)
    for number, level, side in np.ndindex(rises.shape):
        wilks = (RISE_68, RISE_95)[level]
        end = end_of(scan, number, wilks, (-1.0, 1.0)[side])
        rises[number, level, side] = due(scan, number, end, wilks)
    # A range of 95 % holds that of 68.
    rises[:, 1] = np.maximum(rises[:, 1], rises[:, 0])
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


def quantile(rises: Floats, linear: Floats, wilks: float) -> float:
    """Return what a share of rises stays below, that of chi-square below `wilks`.

    Parameters
    ----------
    rises, linear : ndarray, shape (D,)
        Rises of -2 ln L, and what the same errors give in the fit made linear, which is distributed as chi-square with
        one degree of freedom.
    wilks : float
        The answer where the two are distributed alike.
    """
    roots = np.linspace(0.0, LARGEST_ROOT, ROOTS + 1)[1:]
    places = roots**2
    below, due = (
        np.mean(ndtr((roots - np.sqrt(np.maximum(one, 0.0))[:, None]) / BLUR), axis=0)
        for one in (rises, linear)
    )
    # Sorted, since a share that falls is scatter (rearrangement: Chernozhukov et al. 2009, Biometrika 96, 559: memory).
    shares = np.sort(gammainc(0.5, 0.5 * places) + below - due)
    return float(np.interp(gammainc(0.5, 0.5 * wilks), shares, places))


def due(scan: Scan, number: int, end: End, wilks: float) -> float:
    """Return what rises of a parameter, over draws about an end of its range, stay below as often as below `wilks`."""
    covariance = scan_of(scan.likelihood, (Valley(end.parameters, 0.0),)).covariance[number]
    if end.cut or not covariance[number] > 0.0:
        return wilks
    rises, linear = _drawn(scan, number, end.parameters, np.nan_to_num(covariance))
    return quantile(rises, linear, wilks)


def _drawn(scan: Scan, number: int, true: Floats, covariance: Floats) -> tuple[Floats, Floats]:
    """Return rises (D,) of a parameter over draws about `true` (P,), and those of the fit made linear there.

    `covariance` (P,) is that of the parameter with each, 0 with those that stay.
    """
    likelihood = scan.likelihood
    slope = likelihood.residuals(true)[1]
    normal = _normal(slope)
    values = likelihood.model(true).total + likelihood.noise(normal)
    linear = (normal @ slope.T @ covariance) ** 2 / covariance[number]
    held = np.zeros(len(true), dtype=bool)
    at, least = lowest(likelihood, values, [suited(likelihood, values, held, true), true], held)
    held[number] = True
    near = at.copy()
    near[:, number] = true[number]
    _, kept = lowest(likelihood, values, [suited(likelihood, values, held, true), near], held)
    return kept - least, linear


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
