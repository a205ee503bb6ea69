"""What a slice of tracing leaves for the next one.

An atom under way is float64 (ATOM_SIZE,): position [m] and velocity [m s-1] at its latest launch in the Sun-fixed
frame; its weight [s-1]; the part of it that survives; its age [s]; the row and column of its place of first release;
1 where it is under way, 0 where the room is free; and what `snapshot` needs beside that: when it was released [s] after
the stated position of a moving body; as what it flies; the number of its launch; how many visits that launch gets and
how many it has had; its limit of age [s]; the age [s] that its cohort's atom reached, the time [s] that it survived,
the steps that it made, and the mean time [s] that the cohort had survived by then.
"""

from typing import NamedTuple

import numpy as np

from tracer.kernels.integrated_flight import new_curve
from tracer.kernels.lanes import WIDTH, new_lanes

RELEASED = 0
"""Counter of the atoms that have been released; the next one's number."""

ENDED = 1
"""Counter of the atoms whose life has ended."""

STEPS = 2
"""Counter of integration steps."""

CURSOR = 3
"""Lane at which the next slice goes on."""

COUNTERS = 4

WEIGHT = 6
SURVIVAL = 7
AGE = 8
HOME_ROW = 9
HOME_COLUMN = 10
UNDER_WAY = 11
CLOCK = 12
ROLE = 13
NUMBER = 14
VISITS = 15
VISITED = 16
LIMIT = 17
SPAN = 18
SURVIVED = 19
STEPS_MADE = 20
MEAN = 21
ATOM_SIZE = 22


class Resume(NamedTuple):
    """What a slice leaves for the next, and room to work in.

    `counters` int64 (COUNTERS,); `atoms` (WIDTH, ATOM_SIZE) fly in `lanes`; `curve` serves a step that is looked at
    closely, `shine` (line,) a sample.
    """

    counters: np.ndarray
    atoms: np.ndarray
    lanes: np.ndarray
    curve: np.ndarray
    shine: np.ndarray


MARGIN = 16
"""Unused numbers, 128 bytes, before and behind each array of a `Resume`.

A step writes to all of them. Two arrays of two threads in one cache line, or in the pair of lines that is fetched
together, would make the processors wait for each other at every write.
"""


def new_resume(lines: int) -> Resume:
    """Return the start of a batch of atoms with `lines` emission lines."""
    return Resume(
        _with_margins(np.zeros(COUNTERS, np.int64)),
        _with_margins(np.zeros(WIDTH * ATOM_SIZE)).reshape(WIDTH, ATOM_SIZE),
        _with_margins(new_lanes()),
        _with_margins(new_curve()),
        _with_margins(np.zeros(lines)),
    )


def _with_margins(array):
    """Return a copy of a flat `array` within memory of which nobody else uses the neighbourhood."""
    room = np.zeros(len(array) + 2 * MARGIN, array.dtype)
    room[MARGIN : MARGIN + len(array)] = array
    return room[MARGIN : MARGIN + len(array)]
