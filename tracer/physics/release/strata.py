"""Strata of launches: boxes of even numbers, each with a known probability and its own number of launches."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.physics.release.even_numbers import DIMENSIONS, SPEED, EvenNumbers
from tracer.physics.release.laws import Floats

Integers = NDArray[np.int64]

FASTEST = float(np.nextafter(1.0, 0.0))
"""Largest even number: the quantile 1 of a speed may be infinite."""


class Boxes(NamedTuple):
    """Boxes that fill the unit cube of even numbers: `low` and `width`, (m, 5).

    The coordinate of the speed counts from the fast end: there alone boxes are so thin that 1 - u needs its digits.
    """

    low: Floats
    width: Floats

    @property
    def probabilities(self) -> Floats:
        """Probabilities of the boxes, (m,)."""
        return np.asarray(np.prod(self.width, axis=1))


class Strata(NamedTuple):
    """`boxes` and how many of a batch's launches each gets, `counts` (m,), each at least 1."""

    boxes: Boxes
    counts: Integers


def one_stratum(count: int) -> Strata:
    """Return all of the cube for `count` launches."""
    return Strata(Boxes(np.zeros((1, DIMENSIONS)), np.ones((1, DIMENSIONS))), np.array([count]))


def draw(strata: Strata, supply: EvenNumbers, first: int, count: int) -> tuple[Floats, Floats]:
    """Return (u, shares) of launches `first` to `first` + `count` - 1 of a batch.

    Launches come stratum by stratum. `u` (count, 5) are even numbers for the release laws, `shares` (count,) the parts
    of the release rate: a stratum's probability over its number of launches, so that all launches together have 1.
    """
    ends = np.cumsum(strata.counts)
    u = supply.points_in_boxes(*strata.boxes, strata.counts, first, count)
    speed = u[:, SPEED]
    np.minimum(np.subtract(1.0, speed, out=speed), FASTEST, out=speed)
    drawn_before = np.clip(np.concatenate(([0], ends)), first, first + count)
    return u, np.repeat(strata.boxes.probabilities / strata.counts, drawn_before[1:] - drawn_before[:-1])


def shared_out(count: int, wanted: Floats) -> Integers:
    """Return whole numbers, (m,), each at least 1 and in all `count`, as near as can be to `wanted`, (m,) in all 1.

    Raises
    ------
    ValueError
        Where `count` is below m.
    """
    boxes = len(wanted)
    if count < boxes:
        raise ValueError(f"{count} launches are too few for {boxes} strata")
    ideal = wanted * (count - boxes)
    counts = np.floor(ideal).astype(np.int64)
    left = count - boxes - int(counts.sum())
    # A stable order: the same on every machine.
    counts[np.argsort(counts - ideal, kind="stable")[:left]] += 1
    return counts + 1
