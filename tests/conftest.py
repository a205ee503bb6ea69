"""Small products that many tests share, and one way to trace a run file's text once a session."""

import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
import xarray as xr

from tracer.engine.batches import compile_kernels, make_work
from tracer.engine.runspec.load import load_run, parse_run
from tracer.engine.scene import build_scene
from tracer.engine.tracing import run
from tracer.fate import FATE_LABELS
from tracer.kernels.integrated_flight import fly, new_curve, new_flight, start_flight
from tracer.observe.gas import gas_of
from tracer.observe.integration import integrals_along
from tracer.observe.sights import Sights
from tracer.product.assembling import assemble
from tracer.product.layout import layout
from tracer.product.provenance import global_attributes
from tracer.tally.axes import Grid
from tracer.tally.field import FieldStatistics

SMALL_RUN = """
title = "Sodium over Harrow, small"

[body]
name = "Harrow"
radius = "1800 km"
gm = "9500 km3 s-2"
rotation_period = "60 d"

[gas]
species = "Na"

[[gas.loss]]
name = "charge exchange"
rate = "1e-5 s-1"

[[release]]
name = "impact vapour"
rate = "2e24 s-1"
speed = { law = "maxwell-flux", temperature = "3500 K" }
place = { law = "cosine-power", toward = "dawn", power = 1 }

[[release]]
name = "sputtering"
rate = "5e23 s-1"
speed = { law = "sigmund-thompson", binding_energy = "2 eV", cutoff_energy = "2020.75 eV" }
place = { law = "band", latitude = ["30 deg", "60 deg"] }

[surface]
temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }
sticking = 0.4
accommodation = 0.7

[domain]
outer_radius = "20 radii"
age_limit = "30 d"

[grid]
altitude = { first_cell = "50 km", top = "3 radii", cells = 5 }
latitude_cells = 4
local_time_cells = 6

[[image]]
name = "tail from north"
look_from = "north"
horizontal = ["-5 radii", "3 radii"]
vertical = ["-3 radii", "3 radii"]
pixels = [8, 6]

[ensemble]
particles_per_batch = 250
batches = 6
replicates = 3
"""

SUN = """
[sun]
distance = "0.35 au"
radial_velocity = "8 km/s"
solar_activity = 0.5
"""

LIGHT = """scaling = "inverse-square"
where = "sunlight"

[[gas.line]]
name = "invented"
wavelength = "500 nm"
g = "0.2 s-1"
"""

SMALL_LIGHT_RUN = SMALL_RUN.replace("\n[gas]", SUN + "\n[gas]").replace(
    'rate = "1e-5 s-1"\n', 'rate = "1e-5 s-1"\n' + LIGHT
)

MOVING_RUN = SMALL_LIGHT_RUN.replace(
    'distance = "0.35 au"\nradial_velocity = "8 km/s"', 'true_anomaly = "60 deg"\nmotion = "moving"'
).replace('rotation_period = "60 d"', 'orbit = { semi_major_axis = "0.4 au", eccentricity = 0.2 }')

HOST = """
[body.host]
gm = "2e7 km3 s-2"
radius = "30000 km"
distance = "400000 km"
phase_angle = "5 deg"
rotation = "turning"
"""

HOST_RUN = SMALL_LIGHT_RUN.replace("\n[sun]", HOST + "\n[sun]")

MOVING_HOST_RUN = MOVING_RUN.replace("\n[sun]", HOST.replace('rotation = "turning"\n', "") + "\n[sun]")

WARM_KERNELS = str(Path(__file__).with_name("warm_kernels.py"))


CHECK_CONVENTIONS = str(Path(__file__).with_name("check_conventions.py"))


@pytest.fixture(scope="session")
def check_conventions() -> Callable[..., "subprocess.CompletedProcess[str]"]:
    """Return what runs the CF checker on a file, by default leniently."""

    def check(path: Path | str, criteria: str = "lenient") -> "subprocess.CompletedProcess[str]":
        words = ["--test=cf:1.11", "--criteria", criteria, "-f", "text", str(path)]
        return subprocess.run([sys.executable, CHECK_CONVENTIONS, *words], capture_output=True, text=True)

    return check


def pytest_sessionstart(session: pytest.Session) -> None:
    """Compile the kernels once, into the cache that all test processes share, before these processes start."""
    if hasattr(session.config, "workerinput") or not session.config.getoption("numprocesses", None):
        return
    # The kernels of bodies that move are compiled beside the others, which would take as long again after them; those
    # of moons beside a host are compiled apart again.
    beside = subprocess.Popen([sys.executable, WARM_KERNELS], stdin=subprocess.PIPE, text=True)
    assert beside.stdin
    beside.stdin.write("\f".join((MOVING_RUN, MOVING_HOST_RUN)))
    beside.stdin.close()
    for text in (SMALL_RUN, HOST_RUN, SMALL_LIGHT_RUN):
        scene = build_scene(parse_run(text, "run file"))
        work = make_work(scene, 1, 1)
        compile_kernels(work)
    flight, curve = new_flight(), new_curve()
    conditions = work.world.light.conditions
    start_flight(flight, conditions, 1e-6, scene.body.radius, 0.0, 0.0, 1000.0, 0.0, 0.0)
    fly(flight, curve, conditions, 1e-6, 1.0)
    looks = Sights(np.array([[5.0, 0.0, 0.0]]), np.array([[-1.0, 0.0, 0.0]]))
    grid = Grid(1.0, np.array([0.0, 1.0]), np.array([-90.0, 0.0, 90.0]), np.array([0.0, 12.0, 24.0]))
    integrals_along(gas_of(_filled(grid, np.ones((1, 1, 2, 2)))), looks)
    assert beside.wait() == 0


@pytest.fixture(scope="session")
def small_run_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a run file that uses most of gravity's keys and traces in a blink; not to be changed."""
    path = tmp_path_factory.mktemp("small") / "harrow-small.toml"
    path.write_text(SMALL_RUN, encoding="utf-8")
    return path


@pytest.fixture(scope="session")
def small_product(small_run_file: Path) -> xr.Dataset:
    """Return the product of `small_run_file`; not to be changed."""
    return run(load_run(small_run_file), workers=1)


@pytest.fixture(scope="session")
def small_light_run_file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return `small_run_file` put into sunlight: pushed, shining, ionised, with a shadow; not to be changed."""
    path = tmp_path_factory.mktemp("small_light") / "harrow-small-light.toml"
    path.write_text(SMALL_LIGHT_RUN, encoding="utf-8")
    return path


@pytest.fixture(scope="session")
def small_light_product(small_light_run_file: Path) -> xr.Dataset:
    """Return the product of `small_light_run_file`; not to be changed."""
    return run(load_run(small_light_run_file), workers=1)


@pytest.fixture(scope="session")
def traced() -> Callable[[str], xr.Dataset]:
    """Return a function that traces a run file's text, each text once a session."""
    known: dict[str, xr.Dataset] = {}

    def trace(text: str) -> xr.Dataset:
        if text not in known:
            known[text] = run(parse_run(text, "run file"), workers=1)
        return known[text]

    return trace


@pytest.fixture(scope="session")
def filled() -> Callable[..., xr.Dataset]:
    """Return a function that makes a product with given cells, in which nothing but gas and light is not zero."""
    return _filled


def _filled(
    grid: Grid,
    density: npt.ArrayLike,
    emission: npt.ArrayLike | None = None,
    replicates: npt.ArrayLike | None = None,
    emission_replicates: npt.ArrayLike | None = None,
    lines: tuple[str, ...] = ("na_d2",),
    **attributes: Any,
) -> xr.Dataset:
    density = np.asarray(density, dtype=np.float64)
    cells = (len(grid.altitude_edges) - 1, len(grid.latitude_edges) - 1, len(grid.local_time_edges) - 1)
    releases, count = density.shape[0], 2 if replicates is None else len(np.asarray(replicates))
    known = {"number_density": (density, replicates), "emission_rate": (emission, emission_replicates)}
    names = lines if emission is not None else ()
    sizes = dict(zip(("altitude", "latitude", "local_time"), cells, strict=True))
    sizes |= {"release": releases, "fate": len(FATE_LABELS), "line": len(names)}
    fields = {}
    for name, row in layout((), bool(names)).items():
        if row.tallied:
            mean, groups = known.get(name, (None, None))
            shape = tuple(sizes[axis] for axis in row.dimensions)
            mean = np.zeros(shape) if mean is None else np.broadcast_to(mean, shape)
            if groups is None:
                groups = np.broadcast_to(mean, (count, *shape)) if row.replicated else None
            fields[name] = FieldStatistics(
                mean, np.zeros(shape), None if groups is None else np.asarray(groups)
            )
    attributes = {**global_attributes("Filled", "test"), "body_radius": grid.body_radius, **attributes}
    return assemble(grid, (), [f"release {i}" for i in range(releases)], fields, {}, attributes, names)
