"""How a law of launch speed is spread over bins: its probabilities and Legendre moments within each."""

import numpy as np

from tracer.physics.release.laws import Floats, SpeedDensity

PARTS = 8
NODES = 8
"""A bin is cut into parts of as many Gauss-Legendre nodes each: exact to 1e-6 up to 15 widths of a Maxwellian."""

_PLACES, _WEIGHTS = np.polynomial.legendre.leggauss(NODES)


def legendre_moments(law: SpeedDensity, edges: Floats, mass: float, orders: int = 2) -> Floats:
    """Return the integrals of a law's density times the Legendre polynomials of the place in each bin.

    Parameters
    ----------
    law : SpeedDensity
        The law of launch speed.
    edges : ndarray, shape (n + 1,)
        Edges of the bins [m s-1], rising.
    mass : float
        Mass of an atom [kg].
    orders : int
        Polynomials P_0 to P_(orders - 1), of x from -1 to 1 through the bin.

    Returns
    -------
    ndarray, shape (n, orders)
        The first column holds the probabilities of the bins.
    """
    steps = np.arange(PARTS) / PARTS
    cuts = np.append((edges[:-1, np.newaxis] + steps * np.diff(edges)[:, np.newaxis]).ravel(), edges[-1])
    kinks = law.kinks()
    if kinks.size:
        cuts = np.union1d(cuts, kinks[(kinks > edges[0]) & (kinks < edges[-1])])
    half = 0.5 * np.diff(cuts)[:, np.newaxis]
    speeds = cuts[:-1, np.newaxis] + half * (1.0 + _PLACES)
    weights = law.density(speeds, mass) * half * _WEIGHTS
    place = np.searchsorted(edges, 0.5 * (cuts[1:] + cuts[:-1])) - 1
    low, high = edges[place, np.newaxis], edges[place + 1, np.newaxis]
    polynomials = np.polynomial.legendre.legvander((2.0 * speeds - low - high) / (high - low), orders - 1)
    by_part = np.einsum("in,ink->ik", weights, polynomials)
    return np.asarray(np.add.reduceat(by_part, np.searchsorted(place, np.arange(len(edges) - 1)), axis=0))
