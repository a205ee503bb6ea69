"""Runs as real processes that are killed, interrupted, starved of disk, or started twice."""

import os
import random
import signal
import time
from functools import partial
from pathlib import Path

import pytest

import tracer

RUN_FILE = Path(__file__).with_name("ball.toml").read_text(encoding="utf-8")
RUN = ("run", "ball.toml", "--workers", "2")
SHORT = (*RUN, "--set", "ensemble.batches=4")
RESUME = (*RUN, "--resume")


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "ball.toml").write_text(RUN_FILE, encoding="utf-8")
    return tmp_path


@pytest.fixture(scope="module")
def checksum(tmp_path_factory) -> str:
    """Return the checksum of the run that nothing happened to."""
    path = tmp_path_factory.mktemp("whole") / "ball.toml"
    path.write_text(RUN_FILE, encoding="utf-8")
    return str(tracer.run(tracer.load_run(path)).attrs["data_checksum"])


def checkpoints(folder: Path) -> list[Path]:
    return sorted(folder.glob(".ball.nc.checkpoint-[ab]"))


def marks(folder: Path) -> dict[Path, int]:
    return {path: path.stat().st_mtime_ns for path in checkpoints(folder)}


def product_checksum(folder: Path) -> str:
    with tracer.open_product(folder / "ball.nc") as ds:
        return str(ds.attrs["data_checksum"])


def names(folder: Path) -> list[str]:
    return sorted(entry.name for entry in folder.iterdir() if entry.suffix not in (".out", ".err"))


def test_killed_at_five_random_moments_and_resumed_a_run_makes_the_same_product(start, folder, checksum):
    chance = random.Random(20310601)
    for _ in range(5):
        before = marks(folder)
        process = start(RESUME)
        process.wait_until(partial(lambda old: marks(folder) != old, before))
        time.sleep(chance.uniform(0.0, 0.1))
        process.signal(signal.SIGKILL)
        assert process.wait().code == -signal.SIGKILL
        assert not (folder / "ball.nc").exists()
    done = start(RESUME).wait()
    assert done.code == 0, done.err
    assert product_checksum(folder) == checksum
    assert names(folder) == ["ball.nc", "ball.toml"]


def test_ctrl_c_ends_with_3_keeps_a_checkpoint_and_says_how_to_go_on(start, folder, checksum):
    process = start(RUN)
    process.wait_until(lambda: len(checkpoints(folder)) > 0)
    process.signal(signal.SIGINT)
    interrupted = process.wait()
    assert interrupted.code == 3
    last = interrupted.err.splitlines()[-1]
    assert last.startswith("tracer: interrupted; ball.nc was not written. ")
    assert last.endswith(" kept; go on with: tracer run ball.toml -o ball.nc --workers 2 --resume")
    assert names(folder)[-1] == "ball.toml"
    done = start(last.partition("go on with: tracer ")[2].split()).wait()
    assert done.code == 0
    assert "going on from the checkpoint at batch " in done.err
    assert product_checksum(folder) == checksum


def test_a_second_ctrl_c_stops_at_once(start, folder):
    process = start(RUN, interval=60.0)
    process.wait_until(lambda: "tracing" in process.files[1].read_text())
    begin = time.monotonic()
    process.signal(signal.SIGINT)
    process.signal(signal.SIGINT)
    assert process.wait().code == 3
    # Slices last 0.1 s; the machine may be busy with other tests.
    assert time.monotonic() - begin < 3.0
    assert not [name for name in names(folder) if name.endswith(".part")]


def test_a_request_to_end_is_heard_like_ctrl_c(start, folder):
    process = start(RUN)
    process.wait_until(lambda: len(checkpoints(folder)) > 0)
    process.signal(signal.SIGTERM)
    done = process.wait()
    assert done.code == 3
    assert "go on with: " in done.err


def test_an_interrupted_run_is_not_started_afresh_unasked(start, folder, checksum):
    process = start(RUN)
    process.wait_until(lambda: len(checkpoints(folder)) > 0)
    process.signal(signal.SIGKILL)
    process.wait()
    refused = start(RUN).wait()
    assert refused.code == 2
    assert refused.err == (
        "tracer: ball.nc: an interrupted run has left a checkpoint; --resume goes on from it, "
        "--overwrite starts afresh\n"
    )
    assert checkpoints(folder)
    afresh = start((*RUN, "--overwrite")).wait()
    assert afresh.code == 0
    assert "going on" not in afresh.err
    assert product_checksum(folder) == checksum


def test_resuming_a_complete_product_says_so_and_ends_with_0(start, folder):
    assert start(SHORT).wait().code == 0
    before = (folder / "ball.nc").read_bytes()
    again = start((*SHORT, "--resume")).wait()
    assert again.code == 0
    assert again.out == "product: ball.nc is complete already: nothing to do\n"
    other = start((*SHORT, "--resume", "--set", "ensemble.seed=5")).wait()
    assert other.code == 2
    assert other.err == "tracer: ball.nc: exists; --overwrite replaces it, or name another output\n"
    assert (folder / "ball.nc").read_bytes() == before


def test_of_two_racing_runs_one_makes_the_product_and_the_other_is_refused_at_once(start, folder, checksum):
    racers = [start(RUN) for _ in range(2)]
    ended = sorted((racer.wait() for racer in racers), key=lambda done: done.code)
    assert [done.code for done in ended] == [0, 2]
    assert ended[1].err == (
        "tracer: ball.nc: is being made by another run; wait for it, or name another output\n"
    )
    assert product_checksum(folder) == checksum


@pytest.mark.parametrize("size", [20_000, 400_000])
def test_a_disk_that_fills_leaves_the_old_product_whole_and_the_work_where_it_fits(
    start, folder, checksum, size
):
    (folder / "ball.nc").write_bytes(b"old and precious")
    # Files that cannot grow stand for the full disk: 20 kB hold neither checkpoint nor product, 400 kB no checkpoint.
    starved = start((*SHORT, "--overwrite"), interval=0.0, file_size=size).wait()
    assert starved.code == 1
    assert "no checkpoint could be written: File too large" in starved.err
    last = starved.err.splitlines()[-1]
    assert last.startswith("tracer: ball.nc: cannot be written: is the disk full?")
    assert (folder / "ball.nc").read_bytes() == b"old and precious"
    assert names(folder) == ["ball.nc", "ball.toml"]
    assert start((*SHORT, "--overwrite")).wait().code == 0
    assert product_checksum(folder) != checksum


def test_a_product_that_does_not_fit_leaves_a_checkpoint_to_go_on_from(start, folder, checksum):
    blocker = folder / "ball.nc"
    process = start(RUN)
    process.wait_until(lambda: len(checkpoints(folder)) > 0)
    # Something else takes the product's name meanwhile: it must not be lost, nor must the work.
    blocker.write_bytes(b"precious")
    refused = process.wait()
    assert refused.code == 2
    assert "exists; --overwrite replaces it" in refused.err
    assert "60 batches are kept; go on with: tracer run ball.toml" in refused.err
    assert blocker.read_bytes() == b"precious"
    blocker.unlink()
    done = start(RESUME).wait()
    assert done.code == 0
    assert "going on from the checkpoint at batch 60" in done.err
    assert product_checksum(folder) == checksum


def test_a_folder_that_vanishes_is_one_message(start, folder):
    (folder / "out").mkdir()
    process = start((*RUN, "-o", "out/ball.nc"))
    process.wait_until(lambda: any((folder / "out").glob(".ball.nc.checkpoint-[ab]")))
    os.rename(folder / "out", folder / "gone")
    done = process.wait()
    assert done.code == 2
    assert "no checkpoint could be written: No such file or directory" in done.err
    assert done.err.splitlines()[-1].startswith("tracer: out/ball.nc: there is no folder ")


@pytest.mark.skipif(hasattr(os, "geteuid") and os.geteuid() == 0, reason="root may write everywhere")
def test_a_read_only_folder_is_refused_before_tracing(start, folder):
    (folder / "out").mkdir()
    (folder / "out").chmod(0o500)
    done = start((*RUN, "-o", "out/ball.nc")).wait()
    assert done.code == 2
    assert "Permission denied" in done.err
