"""Boxes of launches, halved where a sample of flights tells them apart."""

from heapq import heapify, heappop, heappush
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.physics.release.even_numbers import DIMENSIONS
from tracer.physics.release.laws import Floats
from tracer.physics.release.strata import Boxes

LEAST_SAMPLE = 12
"""Flights in a box below which it is not halved: fewer say too little."""

LEAST_GAIN = 3e-4
"""Part of the whole that halving a box must gain."""


class Sample(NamedTuple):
    """Sampled launches: the `box` (n,) of each, its `points` (n, 5) within the unit cube of that box, and what it did.

    `importance` (n,) is the square of what it left where it counts, see `importance`; `costs` (n,) its time.
    """

    box: NDArray[np.int64]
    points: Floats
    importance: Floats
    costs: Floats


class _Leaf(NamedTuple):
    low: Floats
    width: Floats
    flights: NDArray[np.int64]
    mean: float
    """Mean importance."""

    expected: float
    """The same, drawn a little towards that of the box it was cut from: no flight of few may be bad luck."""

    error: float
    """Probability times the root of importance times cost: what the best sampling spends on the box."""


def importance(scores: Floats, weights: Floats) -> Floats:
    """Return (n,) sums over m fields of (score over the field's total)^2 from `scores` (n, m) with `weights` (n,).

    Its mean over independent launches is the sum of the relative variances of all fields: all count alike.
    """
    totals = weights @ scores
    hit = totals > 0.0
    return np.asarray(np.sum((scores[:, hit] / totals[hit]) ** 2, axis=1))


def halved(boxes: Boxes, sample: Sample, most: int) -> tuple[Boxes, Floats]:
    """Return at most `most` boxes cut from `boxes`, and the share of launches that each should get, (m,) in all 1.

    Launches in proportion to probability times the root of importance over cost give the smallest variance for the
    time (Neyman 1934, J. R. Stat. Soc. 97, 558; Cochran 1977, Sampling Techniques, section 5.5: memory). Boxes are
    halved along one coordinate, always there where that lowers the sum most.
    """
    leaves = []
    for i in range(len(boxes.low)):
        flights = np.flatnonzero(sample.box == i)
        mean = float(sample.importance[flights].mean())
        leaves.append(_leaf(sample, boxes.low[i], boxes.width[i], flights, mean))
    leaves = _cut(leaves, sample, boxes, most)
    result = Boxes(np.array([leaf.low for leaf in leaves]), np.array([leaf.width for leaf in leaves]))
    costs = np.array([_mean_cost(sample, leaf.flights) for leaf in leaves])
    wanted = result.probabilities * np.sqrt([leaf.expected for leaf in leaves] / costs)
    total = wanted.sum()
    return result, wanted / total if total > 0.0 else result.probabilities


def _cut(leaves: list[_Leaf], sample: Sample, boxes: Boxes, most: int) -> list[_Leaf]:
    limit = LEAST_GAIN * sum(leaf.error for leaf in leaves)
    kept: list[_Leaf] = []
    # The running number decides between equal gains.
    queue = [_candidate(sample, boxes, leaf, i) for i, leaf in enumerate(leaves)]
    heapify(queue)
    number = len(queue)
    while queue and len(queue) + len(kept) < most:
        gain, _, leaf, children = heappop(queue)
        if -gain <= limit or children is None:
            kept.append(leaf)
            continue
        for child in children:
            heappush(queue, _candidate(sample, boxes, child, number))
            number += 1
    return kept + [entry[2] for entry in sorted(queue, key=lambda entry: entry[1])]


_Candidate = tuple[float, int, _Leaf, tuple[_Leaf, _Leaf] | None]


def _candidate(sample: Sample, boxes: Boxes, leaf: _Leaf, number: int) -> _Candidate:
    """Return (minus the gain, number, leaf, its best halves); no halves where no cut gains."""
    best: tuple[float, tuple[_Leaf, _Leaf] | None] = (0.0, None)
    if len(leaf.flights) >= 2 * LEAST_SAMPLE:
        for axis in range(DIMENSIONS):
            children = _halves(sample, boxes, leaf, axis)
            gain = leaf.error - sum(child.error for child in children)
            if gain > best[0] and min(len(child.flights) for child in children) >= LEAST_SAMPLE:
                best = gain, children
    return -best[0], number, leaf, best[1]


def _halves(sample: Sample, boxes: Boxes, leaf: _Leaf, axis: int) -> tuple[_Leaf, _Leaf]:
    width = leaf.width.copy()
    width[axis] *= 0.5
    upper = leaf.low.copy()
    upper[axis] += width[axis]
    box = sample.box[leaf.flights[0]]
    middle = (upper[axis] - boxes.low[box, axis]) / boxes.width[box, axis]
    above = sample.points[leaf.flights, axis] >= middle
    return (
        _leaf(sample, leaf.low, width, leaf.flights[~above], leaf.mean),
        _leaf(sample, upper, width, leaf.flights[above], leaf.mean),
    )


def _leaf(sample: Sample, low: Floats, width: Floats, flights: NDArray[np.int64], before: float) -> _Leaf:
    total, count = float(sample.importance[flights].sum()), len(flights)
    mean = total / max(1, count)
    error = float(np.prod(width)) * np.sqrt(mean * _mean_cost(sample, flights))
    return _Leaf(low, width, flights, mean, (total + before) / (count + 1), error)


def _mean_cost(sample: Sample, flights: NDArray[np.int64]) -> float:
    return float(sample.costs[flights].mean()) if len(flights) else 1.0
