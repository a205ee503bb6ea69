"""Sweeps as real processes that are killed, interrupted, starved of disk, or started twice."""

import signal
from functools import partial
from pathlib import Path

import numpy as np
import pytest

import tracer

RUN_FILE = """
title = "Survival"
body = { name = "Ball", radius = "1000 km", gm = "3000 km3 s-2" }
gas = { species = "He" }
surface = { temperature = { law = "uniform", value = "250 K" }, sticking = 0.2 }
domain = { outer_radius = "20 radii", age_limit = "1 yr" }
grid = { altitude = { cells = 10 }, latitude_cells = 9, local_time_cells = 12 }
ensemble = { particles_per_batch = 1000, batches = 20 }
[[release]]
name = "vent"
rate = "1e20 s-1"
speed = { law = "maxwell-flux", temperature = "surface" }
[sweep]
[[sweep.axis]]
key = "surface.temperature.value"
name = "ground"
first = "200 K"
last = "300 K"
count = 3
"""
SWEEP = ("sweep", "ball.toml", "--workers", "2")
RESUME = (*SWEEP, "--resume")
FOLDER = ".ball.nc.points"


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "ball.toml").write_text(RUN_FILE, encoding="utf-8")
    return tmp_path


@pytest.fixture(scope="module")
def densities(tmp_path_factory):
    """Return the densities of the sweep that nothing happened to."""
    path = tmp_path_factory.mktemp("whole") / "ball.toml"
    path.write_text(RUN_FILE, encoding="utf-8")
    tracer.run_sweep(tracer.load_sweep(path), path.with_suffix(".nc"), workers=1)
    return made(path.parent)


def made(folder: Path) -> np.ndarray:
    with tracer.open_sweep(folder / "ball.nc") as ds:
        return ds.number_density_replicates.values


def points(folder: Path) -> list[Path]:
    return sorted((folder / FOLDER).glob("*.nc"))


def checkpoints(folder: Path) -> list[Path]:
    return sorted((folder / FOLDER).glob(".*.checkpoint-[ab]"))


def is_within(folder: Path, finished: int) -> bool:
    """Return whether so many points are finished and a checkpoint of the next is there."""
    whole = [path.name for path in points(folder)]
    return len(whole) == finished and any(
        path.name[1:].partition(".checkpoint")[0] not in whole for path in checkpoints(folder)
    )


def names(folder: Path) -> list[str]:
    return sorted(entry.name for entry in folder.iterdir() if entry.suffix not in (".out", ".err"))


def test_killed_in_its_first_and_in_its_second_point_a_sweep_goes_on_to_the_same_product(
    start, folder, densities
):
    for finished in range(2):
        process = start(RESUME)
        process.wait_until(partial(is_within, folder, finished))
        process.signal(signal.SIGKILL)
        assert process.wait().code == -signal.SIGKILL
        assert not (folder / "ball.nc").exists()
    done = start(RESUME).wait()
    assert done.code == 0, done.err
    assert "going on from the checkpoint at batch " in done.err
    np.testing.assert_array_equal(made(folder), densities)
    assert names(folder) == ["ball.nc", "ball.toml"]


def test_ctrl_c_ends_with_3_and_says_how_to_go_on(start, folder, densities):
    process = start(SWEEP)
    process.wait_until(partial(is_within, folder, 1))
    process.signal(signal.SIGINT)
    interrupted = process.wait()
    assert interrupted.code == 3
    last = interrupted.err.splitlines()[-1]
    assert last.startswith("tracer: interrupted; ball.nc was not written. 1 point")
    assert last.endswith(" kept; go on with: tracer sweep ball.toml -o ball.nc --workers 2 --resume")
    refused = start(SWEEP).wait()
    assert refused.code == 2
    assert (
        "an interrupted sweep has left finished points or checkpoints; --resume goes on from them"
        in refused.err
    )
    done = start(last.partition("go on with: tracer ")[2].split()).wait()
    assert done.code == 0
    assert "1 of 3 points are finished already" in done.err
    np.testing.assert_array_equal(made(folder), densities)


def test_a_second_sweep_for_the_same_output_is_refused_at_once(start, folder):
    first = start(SWEEP)
    first.wait_until(lambda: checkpoints(folder) != [])
    second = start(RESUME).wait()
    assert second.code == 2
    assert second.err.endswith(
        "tracer: ball.nc: is being made by another run; wait for it, or name another output\n"
    )
    first.signal(signal.SIGKILL)
    first.wait()


def test_a_disk_that_fills_leaves_no_half_file_and_what_fits_is_gone_on_from(start, folder, densities):
    # Files that cannot grow stand for the full disk: points fit, the product of all does not.
    probe = start(SWEEP).wait()
    assert probe.code == 0, probe.err
    whole = (folder / "ball.nc").stat().st_size
    starved = start((*SWEEP, "--overwrite"), file_size=int(0.7 * whole)).wait()
    assert starved.code == 1
    last = starved.err.splitlines()[-1]
    assert last.startswith("tracer: ball.nc: cannot be written: is the disk full?")
    assert (
        "3 points kept; go on with: tracer sweep ball.toml -o ball.nc --workers 2 --overwrite --resume"
        in last
    )
    assert (folder / "ball.nc").stat().st_size == whole
    assert names(folder) == [FOLDER, "ball.nc", "ball.toml"]
