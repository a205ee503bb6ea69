"""How a response bends within a bin of launch speed, told from its means there and beside, and how wrong that may be.

With x from -1 to 1 through a bin, c(x) what an atom leaves and p(x) the law, the product knows R0 and R1, the means of
c and of c x. The mean R2 of c P2(x) is that of the cubic which has R0 and R1 of the bin and of the next slower one: as
laws fall with speed, what a threshold inside a bin makes wrong beside it goes to where few atoms are. Everything is
linear in the responses, so that it is as unbiased, and adds up over pixels and replicates, as they do. (A shape that is
nowhere below zero would be nearer at thresholds, but one hit in a bin would then count for more than it should.)
"""

from functools import lru_cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.physics.release.laws import SpeedDensity
from tracer.physics.release.speed_moments import unsigned_rest

Floats = NDArray[np.float64]

NODES = 65
"""Speeds in a bin, ends included, between which a law is straight where it is bounded by positivity alone."""

CARE = 1.5
"""What the differences between several ways to tell R2 are multiplied with. For 14 laws, 150 to 4,800 K and sputtered,
and 1,800 responses with thresholds, kinks, jumps and peaks anywhere the bound then holds in 99.9 %, always where there
is a threshold alone, and what is wrong is at most 1.3 times the bound (`analysis/validation/speed-responses`)."""

BESIDE = 2
"""Bins to either side from which R2 of a bin is told."""

RAMP_CENTRE = 1.0 / 3.0
"""Mean of x under densities that rise or fall evenly through a bin: where R0 + R1 and R0 - R1 are known."""


class Bend(NamedTuple):
    """Ways to tell R2 of a bin: weights of R0 and R1 of n bins from `first` on.

    `chosen` (n, 2) is taken from one side of the escape speed alone; `others` are (ways, n, 2).
    """

    first: int
    chosen: Floats
    others: Floats


class Doubt(NamedTuple):
    """What of a law the means of a bin leave open.

    `moments` (bins, 3) are its Legendre moments, `rest` (bins,) the integral of the size of what is no parabola in it;
    `least` and `most` (bins, NODES) are what a response of mean 1 can give at least and at most if it is nowhere below
    zero and its centre stands at each of the nodes: the convex and the concave envelope of the law.
    """

    moments: Floats
    rest: Floats
    least: Floats
    most: Floats


def bends(edges: Floats, escape: float) -> tuple[Bend, ...]:
    """Return for each bin between `edges` (bins + 1,) [m s-1] how R2 is told, for an `escape` speed [m s-1]."""
    return _bends(np.ascontiguousarray(edges, np.float64).tobytes(), escape)


def bend_weights(second: Floats, edges: Floats, escape: float) -> Floats:
    """Return the weights (bins, 2) of R0 and R1 in the sum over bins of 5 Q R2, `second` (bins,) being each bin's Q."""
    matrix = _bend_matrix(np.ascontiguousarray(edges, np.float64).tobytes(), escape)
    return np.asarray(np.tensordot(second, matrix, 1))


def doubt_of(law: SpeedDensity, edges: Floats, mass: float, moments: Floats) -> Doubt:
    """Return what the means of the bins leave open of a law with these `moments` (bins, 3)."""
    width = np.diff(edges)[:, np.newaxis]
    density = law.density(edges[:-1, np.newaxis] + width * np.linspace(0.0, 1.0, NODES), mass) * width
    least = np.array([-_concave_envelope(-row) for row in density])
    most = np.array([_concave_envelope(row) for row in density])
    return Doubt(moments, unsigned_rest(law, edges, mass, moments), least, most)


def bias_bound(doubt: Doubt, edges: Floats, escape: float, responses: Floats, first: int = 0) -> Floats:
    """Return how far off the widths of the bins may put what a law makes of responses, at least 0.

    Parameters
    ----------
    doubt : Doubt
        Of the law, over all bins.
    edges, escape
        See `bends`.
    responses : ndarray, shape (n, 2, ...)
        R0 and R1 of n bins from number `first` on: those in which the law has a part, and `BESIDE` to either side.

    Returns
    -------
    ndarray, shape (...)
        The sum over bins of the smaller of two bounds. One is strict: c is nowhere below zero, so that with R0 and the
        centre R1/R0 given the integral of p c lies between the convex and the concave envelope of p at the centre
        (Jensen's inequality). The other is `CARE` times 5 |Q| |R2 - R2'| + 5 L |R2'|, each the largest over the other
        ways to tell R2, Q the law's second moment and L the integral of the size of what is no parabola in it: it
        takes c to bend inside a bin about as much as between the bins' halves, and has no proof, see `CARE`. Noise of
        the responses makes it larger, on the average never smaller.
    """
    bound = np.zeros(responses.shape[2:])
    every = bends(edges, escape)
    for place in range(len(responses)):
        number = first + place
        if not doubt.moments[number].any():
            continue
        bend = every[number]
        beside = responses[bend.first - first : bend.first - first + len(bend.chosen)]
        second = np.tensordot(bend.chosen, beside, 2)
        bound_of_bin = _strict_bound(doubt, number, responses[place], second)
        if len(bend.others):
            others = np.tensordot(bend.others, beside, 2)
            away = np.abs(others - second).max(axis=0)
            size = np.abs(others).max(axis=0)
            smooth = 5.0 * (abs(doubt.moments[number, 2]) * away + doubt.rest[number] * size)
            bound_of_bin = np.minimum(bound_of_bin, CARE * smooth)
        bound += bound_of_bin
    return bound


def _strict_bound(doubt: Doubt, number: int, response: Floats, second: Floats) -> Floats:
    """Return how far a bin's part can be off at most, for a response (2, ...) that is nowhere below zero."""
    mean = np.maximum(response[0], 0.0)
    centre = np.divide(response[1], mean, out=np.zeros_like(mean), where=mean > 0.0)
    nodes = np.linspace(-1.0, 1.0, NODES)
    least, most = (mean * np.interp(centre, nodes, one[number]) for one in (doubt.least, doubt.most))
    p0, p1, p2 = doubt.moments[number]
    told = p0 * response[0] + 3.0 * p1 * response[1] + 5.0 * p2 * second
    return np.asarray(np.maximum(0.0, np.maximum(most - told, told - least)))


def _concave_envelope(values: Floats) -> Floats:
    """Return the lowest concave function above `values` at even places."""
    bend = np.diff(values, 2)
    # Most bins of most laws, without a loop over the nodes.
    if np.all(bend <= 0.0):
        return values
    if np.all(bend >= 0.0):
        return np.linspace(values[0], values[-1], len(values))
    corners: list[int] = []
    for place, value in enumerate(values):
        while len(corners) > 1:
            before, last = corners[-2:]
            if (values[last] - values[before]) * (place - before) > (value - values[before]) * (
                last - before
            ):
                break
            corners.pop()
        corners.append(place)
    return np.interp(np.arange(len(values)), corners, values[corners])


@lru_cache(maxsize=8)
def _bends(edge_bytes: bytes, escape: float) -> tuple[Bend, ...]:
    edges = np.frombuffer(edge_bytes, np.float64)
    bins = len(edges) - 1
    # At the escape speed itself a response breaks: atoms above it never come back.
    break_at = int(np.searchsorted(edges, escape * (1.0 - 1e-12)))
    return tuple(
        _bend(edges, number, *((0, break_at) if number < break_at else (break_at, bins)))
        for number in range(bins)
    )


@lru_cache(maxsize=8)
def _bend_matrix(edge_bytes: bytes, escape: float) -> Floats:
    """Return 5 R2 of each bin as weights (bins, bins, 2): a fit asks for the same again and again."""
    every = _bends(edge_bytes, escape)
    matrix = np.zeros((len(every), len(every), 2))
    for number, bend in enumerate(every):
        matrix[number, bend.first : bend.first + len(bend.chosen)] = 5.0 * bend.chosen
    return matrix


def _bend(edges: Floats, number: int, begin: int, end: int) -> Bend:
    """Return how R2 of a bin is told, which lies among the bins `begin` to `end` on one side of the escape speed."""
    # Where there is no bin beside it on its side, others are taken from farther off and from across: these only bound.
    first = max(0, number - (2 if number + 1 == end else 1))
    stop = min(len(edges) - 1, number + (3 if number == begin else 2))
    # Edges of these bins as the bin itself counts: from -1 to 1.
    width = edges[number + 1] - edges[number]
    places = (2.0 * edges[first : stop + 1] - edges[number] - edges[number + 1]) / width
    lower = [one for one in (number - 1, number) if begin <= one and one + 1 < end]
    cubics = [_cubic(places, one - first) for one in lower]
    if not cubics:
        return Bend(first, np.zeros((stop - first, 2)), np.zeros((0, stop - first, 2)))
    return Bend(first, cubics[0], np.array([*cubics, *_parabolas(places)]))


def _cubic(places: Floats, lower: int) -> Floats:
    """Return weights (n, 2) of the R2 from -1 to 1 of the cubic with R0 and R1 of the bins `lower` and `lower` + 1."""
    nodes, shares = np.polynomial.legendre.leggauss(4)
    rows = []
    for left, right in zip(places[lower : lower + 2], places[lower + 1 : lower + 3], strict=True):
        known = np.polynomial.legendre.legvander(0.5 * (left + right) + 0.5 * (right - left) * nodes, 3)
        rows += [0.5 * shares @ known, 0.5 * (shares * nodes) @ known]
    weights = np.zeros((len(places) - 1, 2))
    weights[lower : lower + 2] = np.linalg.inv(np.array(rows))[2].reshape(2, 2) / 5.0
    return weights


def _parabolas(places: Floats) -> list[Floats]:
    """Return weights (n, 2) of the R2 of parabolas through each three neighbours among the halves of the bins."""
    middles, half_widths = 0.5 * (places[1:] + places[:-1]), 0.5 * np.diff(places)
    at = (middles[:, np.newaxis] + RAMP_CENTRE * half_widths[:, np.newaxis] * np.array([-1.0, 1.0])).ravel()
    found = []
    for i in range(1, len(at) - 1):
        before, after = at[i] - at[i - 1], at[i + 1] - at[i]
        # x^2 has an R2 of 2/15.
        difference = np.zeros(len(at))
        difference[i - 1 : i + 2] = 1.0 / before, -1.0 / before - 1.0 / after, 1.0 / after
        falling, rising = (difference * (2.0 / 15.0) / (before + after)).reshape(-1, 2).T
        found.append(np.stack([falling + rising, rising - falling], axis=1))
    return found
