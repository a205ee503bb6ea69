"""Small products that many tests share, and one way to trace a run file's text once a session."""

import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
import xarray as xr
from small_runs import SMALL_LIGHT_RUN, SMALL_RUN

from tracer.engine.runspec.load import load_run, parse_run
from tracer.engine.tracing import run
from tracer.fate import FATE_LABELS
from tracer.product.assembling import assemble
from tracer.product.layout import layout
from tracer.product.provenance import global_attributes
from tracer.tally.axes import Grid
from tracer.tally.field import FieldStatistics

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
    """Compile the kernels once, into the cache that all test processes share, before these processes start.

    Unless the environment says that this has been done.
    """
    if hasattr(session.config, "workerinput") or not session.config.getoption("numprocesses", None):
        return
    if "KERNELS_ARE_WARM" in os.environ:
        return
    subprocess.run([sys.executable, WARM_KERNELS], check=True)


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
