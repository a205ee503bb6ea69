"""Everything of a scene that a flight needs, as numbers."""

from typing import NamedTuple

from tracer.kernels.bounce import Surface
from tracer.kernels.cells import Cells, Images


class Motion(NamedTuple):
    """The forces and bounds of a flight: `gm` [m3 s-2], radii [m], `frame_rate` [rad s-1], `age_limit` [s].

    `frame_rate` is the angular rate of the Sun-fixed frame about +z, `hazard` [s-1] the rate of all losses that act
    everywhere alike.
    """

    gm: float
    radius: float
    outer_radius: float
    frame_rate: float
    age_limit: float
    hazard: float


class World(NamedTuple):
    """Motion, ground and where to count."""

    motion: Motion
    surface: Surface
    cells: Cells
    images: Images
