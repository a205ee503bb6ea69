"""The launches and the scene that every contestant flies: sodium over Mercury at true anomaly 60 deg."""

from pathlib import Path
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

import tracer
from tracer.engine.batches import Work, make_work
from tracer.engine.launching import draw_launches
from tracer.engine.scene import build_scene
from tracer.kernels.launches import Launches
from tracer.kernels.step_control import DEFAULT_TOLERANCE

Floats = NDArray[np.float64]

SEED = 20310601
STEP_SHARE, FIRST_STEP = 0.1, 1.5
"""The share of the tolerance that a step of flight.c may take, and its first step in dynamical times."""

HERE = Path(__file__).parent


class Case(NamedTuple):
    """`work` in sunlight, `gravity` without; `launches` as the package takes them, `states` (n, 6) as all others do."""

    work: Work
    gravity: Work
    launches: Launches
    states: Floats


def make_case(count: int) -> Case:
    """Return the case with `count` launches."""
    spec = tracer.load_run(HERE / "case.toml")
    work = make_work(build_scene(spec), SEED, count)
    gravity = make_work(build_scene(spec.model_copy(update={"sun": None})), SEED, count)
    launches = draw_launches(work.scene, work.scene.releases[0], count, np.random.default_rng(SEED), 1.0)
    places = work.scene.body.radius * launches.positions
    spin = work.scene.ground_spin
    turned = spin * np.column_stack([-places[:, 1], places[:, 0], np.zeros(count)])
    return Case(work, gravity, launches, np.hstack([places, launches.velocities + turned]))


def write_case(path: Path, case: Case, tolerance: float = DEFAULT_TOLERANCE) -> None:
    """Write the case for flight.c, which reads the numbers in this order."""
    world = case.work.world
    forces, losses, shadow = world.light.conditions.sky
    cells = world.cells
    numbers = [
        *(forces.gm, forces.radius, forces.outer_radius, forces.tide_gm, forces.distance),
        *(forces.radial_velocity, forces.turning, forces.light_distance, losses.ionizing),
        *(shadow.sun_radius, shadow.penumbra_sine, shadow.umbra_sine),
        *(STEP_SHARE * tolerance, FIRST_STEP, world.motion.age_limit),
        case.work.scene.releases[0].rate / len(case.states),
        *(cells.first_altitude, cells.cells_per_log),
        *(len(cells.radii) - 1, cells.latitude_cells, cells.local_time_cells),
    ]
    parts = [np.array([len(case.states), *numbers]), cells.radii]
    for pushes, rates in zip(
        knots(world.light.conditions.push_tables), knots(world.light.line_tables), strict=True
    ):
        parts += [np.array([pushes[0], pushes[1], len(pushes[2])]), pushes[2], rates[2]]
    np.concatenate([*parts, case.states.ravel()]).astype("<f8").tofile(path)


def knots(tables: Floats) -> list[tuple[float, float, Floats]]:
    """Return (first velocity, velocity step, values) of each line of the kernels' flat `tables`."""
    lines = []
    for heading in tables[1 : 1 + 4 * int(tables[0])].reshape(-1, 4):
        first, per_step, last, entry = heading
        number = np.arange(int(last) + 1)
        pieces = tables[int(entry) :][: 2 * len(number)].reshape(-1, 2)
        lines.append((first, 1.0 / per_step, pieces[:, 0] + number * pieces[:, 1]))
    return lines
