"""How a law of launch speed is spread over bins: its probabilities and Legendre moments within each."""

from functools import lru_cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

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
    nodes = _law_nodes(law, edges, orders)
    by_part = np.einsum("in,ink->ik", law.density(nodes.speeds, mass), nodes.weights)
    return np.asarray(np.add.reduceat(by_part, nodes.first, axis=0))


def unsigned_rest(law: SpeedDensity, edges: Floats, mass: float, moments: Floats) -> Floats:
    """Return the integrals (bins,) of the size of a law's density less the polynomial that has its `moments`.

    `moments` (bins, orders) and the other arguments are those of `legendre_moments`.
    """
    orders = moments.shape[1]
    nodes = _law_nodes(law, edges, orders)
    place = np.repeat(np.arange(len(edges) - 1), np.diff(np.append(nodes.first, len(nodes.speeds))))
    factors = (2.0 * np.arange(orders) + 1.0) * moments / np.diff(edges)[:, np.newaxis]
    polynomials = nodes.weights / nodes.weights[:, :, :1]
    rest = law.density(nodes.speeds, mass) - np.einsum("ik,ink->in", factors[place], polynomials)
    by_part = np.sum(np.abs(rest) * nodes.weights[:, :, 0], axis=1)
    return np.asarray(np.add.reduceat(by_part, nodes.first))


class _Nodes(NamedTuple):
    """Places and weights of the quadrature: parts of bins, nodes in each, orders; and the first part of each bin."""

    speeds: Floats
    weights: Floats
    first: NDArray[np.int64]


def _law_nodes(law: SpeedDensity, edges: Floats, orders: int) -> _Nodes:
    kinks = law.kinks()
    inside = kinks[(kinks > edges[0]) & (kinks < edges[-1])]
    return _nodes(np.ascontiguousarray(edges, np.float64).tobytes(), inside.tobytes(), orders)


@lru_cache(maxsize=8)
def _nodes(edge_bytes: bytes, kink_bytes: bytes, orders: int) -> _Nodes:
    """Return the nodes for edges and kinks [m s-1]: a fit asks for the same again and again."""
    edges, kinks = (np.frombuffer(one, np.float64) for one in (edge_bytes, kink_bytes))
    steps = np.arange(PARTS) / PARTS
    cuts = np.append((edges[:-1, np.newaxis] + steps * np.diff(edges)[:, np.newaxis]).ravel(), edges[-1])
    cuts = np.union1d(cuts, kinks) if kinks.size else cuts
    half = 0.5 * np.diff(cuts)[:, np.newaxis]
    speeds = cuts[:-1, np.newaxis] + half * (1.0 + _PLACES)
    place = np.searchsorted(edges, 0.5 * (cuts[1:] + cuts[:-1])) - 1
    low, high = edges[place, np.newaxis], edges[place + 1, np.newaxis]
    polynomials = np.polynomial.legendre.legvander((2.0 * speeds - low - high) / (high - low), orders - 1)
    weights = (half * _WEIGHTS)[:, :, np.newaxis] * polynomials
    return _Nodes(speeds, weights, np.searchsorted(place, np.arange(len(edges) - 1)))
