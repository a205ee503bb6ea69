"""Everything of a scene that a flight needs, as numbers."""

from typing import NamedTuple

import numpy as np

from tracer.kernels.adsorption import Adsorption
from tracer.kernels.bounce import Surface
from tracer.kernels.cells import Cells, Images
from tracer.kernels.motion import Conditions
from tracer.kernels.roulette import Roulette
from tracer.kernels.traps import Traps


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


class Light(NamedTuple):
    """What integrated flights need: `conditions`, each line's g (`line_tables`, see `lines`), the `tolerance`."""

    conditions: Conditions
    line_tables: np.ndarray
    tolerance: float


class Snapshot(NamedTuple):
    """How gas about a moving body is counted, see `tracer.kernels.snapshot`.

    Events count in the last `window` [s] before the stated position. `ground_turns` is 1 where the ground turns on its
    own, else it keeps its face to the Sun. `follows_distance` is 1 for a release whose rate goes with the inverse
    square of the body's distance from the Sun, else 0.
    """

    window: float
    ground_turns: float
    follows_distance: float


class World(NamedTuple):
    """Motion, ground, roulette and where to count; flights are integrated under `light` if `integrated`, else arcs.

    `snapshot` is None where the body stands still.
    """

    motion: Motion
    surface: Surface
    adsorption: Adsorption
    traps: Traps
    roulette: Roulette
    cells: Cells
    images: Images
    light: Light
    integrated: bool
    snapshot: Snapshot | None
