"""Cold traps: places that keep whatever lands there."""

import math
from typing import NamedTuple

from tracer.kernels.compiling import kernel
from tracer.kernels.surface_map import SurfaceMap, cell_value

NOWHERE = 0
POLEWARD = 1
MAPPED = 2


class Traps(NamedTuple):
    """Where the ground keeps what lands, for good.

    `where` is NOWHERE, POLEWARD of the latitude whose sine is `least_sine`, north and south, or MAPPED with the
    probability that each landing in a cell of `probability` is the last.
    """

    where: int
    least_sine: float
    probability: SurfaceMap


@kernel
def trapped(traps, x, y, z, rng):
    """Return True where an atom that lands at unit vector (x, y, z) is caught; a chance of 0 or 1 draws no number."""
    if traps.where == POLEWARD:
        return math.fabs(z) >= traps.least_sine
    chance = cell_value(traps.probability, x, y, z)
    return chance > 0.0 and (chance >= 1.0 or rng.random() < chance)
