"""What a slice of tracing leaves for the next one.

An atom under way is float64 (ATOM_SIZE,): position [m] and velocity [m s-1] at its latest launch in the Sun-fixed
frame; its weight [s-1]; the part of it that survives; its age [s]; the row and column of its place of first release;
1 where it is under way, 0 where the room is free.
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
ATOM_SIZE = 12


class Resume(NamedTuple):
    """What a slice leaves for the next, and room to work in.

    `counters` int64 (COUNTERS,); `atom` (ATOM_SIZE,) flies on arcs, `atoms` (WIDTH, ATOM_SIZE) fly in `lanes`; `curve`
    serves a step that is looked at closely, `shine` (line,) a sample.
    """

    counters: np.ndarray
    atom: np.ndarray
    atoms: np.ndarray
    lanes: np.ndarray
    curve: np.ndarray
    shine: np.ndarray


def new_resume(lines: int) -> Resume:
    """Return the start of a batch of atoms with `lines` emission lines."""
    return Resume(
        np.zeros(COUNTERS, np.int64),
        np.zeros(ATOM_SIZE),
        np.zeros((WIDTH, ATOM_SIZE)),
        new_lanes(),
        new_curve(),
        np.zeros(lines),
    )
