"""From the inverse of a distribution to its table for kernels."""

from collections.abc import Callable

import numpy as np

from tracer.kernels.octaves import (
    COEFFICIENTS,
    LEAST,
    LOWER_OCTAVES,
    MIDDLE,
    PARTS,
    UPPER_OCTAVES,
    OctaveTable,
)
from tracer.physics.release.laws import Floats

Quantiles = Callable[[Floats], Floats]


def octave_table(lower: Quantiles, upper: Quantiles, power: float, top: float) -> OctaveTable:
    """Return the table of a distribution on numbers from 0 up, from some 8,500 of its quantiles.

    It gives back quantiles of launch laws to 1e-13, those below 2^-81 to 1e-12; the tests look at both ends.

    Parameters
    ----------
    lower, upper : callable
        Quantiles, (n,), at u (n,) and at 1 - u (n,), for 0 < u < 1 and exact to a few roundings where that is at most
        1/2; smooth but at 0.
    power : float
        Quantiles at small u go as its power.
    top : float
        The quantile at 1, inf where the distribution has no end.
    """
    rows = [
        _rows(lower, np.arange(-LOWER_OCTAVES - 1, -1)),
        _rows(upper, np.arange(-UPPER_OCTAVES, 0)),
    ]
    bottom = float(lower(np.array([LEAST]))[0]) / LEAST**power
    return OctaveTable(np.concatenate(rows).ravel(), bottom, float(power), float(top))


def _rows(quantiles: Quantiles, octaves: "np.ndarray[tuple[int], np.dtype[np.int64]]") -> Floats:
    """Return coefficients, one row a part, of the polynomials through the quantiles at the Chebyshev points of parts.

    An octave of number e reaches from 2^e to twice that.
    """
    places = np.cos(np.pi * (np.arange(COEFFICIENTS) + 0.5) / COEFFICIENTS)
    half = 0.5 / PARTS
    at = MIDDLE + np.arange(PARTS)[:, np.newaxis] / PARTS + half * places
    values = quantiles(np.ldexp(at, octaves[:, np.newaxis, np.newaxis]).ravel()).reshape(-1, COEFFICIENTS)
    powers = np.vander(places, increasing=True)
    return np.asarray(np.linalg.solve(powers, values.T).T / half ** np.arange(COEFFICIENTS))
