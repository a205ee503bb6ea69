"""A run that is interrupted and resumed is the run that was not, whichever checkpoint is left to it."""

import random

import pytest

from tracer.engine import checkpoint_slots
from tracer.engine.checkpoint_slots import Checkpoints
from tracer.engine.runspec.load import load_run
from tracer.engine.tasks import BatchRange
from tracer.engine.tracing import run
from tracer.errors import InputError


class Stopped(Exception):
    """What ends a run here, as Ctrl-C would."""


@pytest.fixture
def spec(small_run_file):
    return load_run(small_run_file)


@pytest.fixture
def output(tmp_path):
    return tmp_path / "out.nc"


def interrupt(spec, output, after: int, resume: bool = False, **options) -> Checkpoints:
    """Run until `after` batches are folded, writing a checkpoint whenever one batch more is."""
    checkpoints = Checkpoints(output, resume)

    def watch(status):
        if status.batches > checkpoints.kept_batches:
            checkpoints.write()
        if status.batches >= after:
            raise Stopped

    with pytest.raises(Stopped):
        run(spec, workers=1, watch=watch, checkpoints=checkpoints, **options)
    return checkpoints


def resumed(spec, output, **options):
    events = []

    def note(event, text, **facts):
        events.append((event, text))

    product = run(spec, workers=2, checkpoints=Checkpoints(output, True, note), note=note, **options)
    return product, dict(events)


@pytest.mark.parametrize("after", [1, 3, 5])
def test_resumed_run_equals_uninterrupted_run(spec, small_product, output, after):
    kept = interrupt(spec, output, after).kept_batches
    assert kept >= after
    product, events = resumed(spec, output)
    assert events["resumed"] == f"going on from the checkpoint at batch {kept}"
    for name in ("data_checksum", "flights", "integration_steps", "batches", "run_hash"):
        assert product.attrs[name] == small_product.attrs[name]
    # Processor seconds of both sessions count, so that rates stay honest.
    assert product.attrs["kernel_seconds"] > 0.0


def test_run_interrupted_again_and_again_equals_uninterrupted_run(spec, small_product, output):
    for after in range(1, 6):
        interrupt(spec, output, after, resume=True)
    assert resumed(spec, output)[0].attrs["data_checksum"] == small_product.attrs["data_checksum"]


def test_resumed_run_would_differ_if_a_batch_counted_twice(spec, small_product, output, monkeypatch):
    # What the claims above rest on: the checksum notices a batch that is folded again.
    interrupt(spec, output, 3)
    honest = checkpoint_slots.Checkpoints._take

    def forgetful(self, path, header, identity, folder):
        honest(self, path, header, identity, folder)
        folder.folded -= len(folder.statistics)

    monkeypatch.setattr(checkpoint_slots.Checkpoints, "_take", forgetful)
    product, _ = resumed(spec, output)
    assert product.attrs["data_checksum"] != small_product.attrs["data_checksum"]


def newest(output):
    return max(Checkpoints(output).existing(), key=lambda path: path.stat().st_mtime_ns)


def cut(path, seed: int) -> None:
    content = path.read_bytes()
    path.write_bytes(content[: random.Random(seed).randrange(len(content))])


@pytest.mark.parametrize("seed", range(4))
def test_the_older_checkpoint_serves_when_the_newer_is_cut(spec, small_product, output, seed):
    interrupt(spec, output, 4)
    path = newest(output)
    cut(path, seed)
    product, events = resumed(spec, output)
    assert product.attrs["data_checksum"] == small_product.attrs["data_checksum"]
    assert events["resumed"].startswith(f"{path.name} ")
    assert events["resumed"].endswith("; going on from the checkpoint at batch 3")


def test_a_run_with_both_checkpoints_damaged_is_refused(spec, output):
    interrupt(spec, output, 4)
    for path in Checkpoints(output).existing():
        path.write_bytes(b"junk")
    with pytest.raises(InputError) as refusal:
        resumed(spec, output)
    assert str(refusal.value) == (
        "out.nc: .out.nc.checkpoint-a is no checkpoint of this program; .out.nc.checkpoint-b is no checkpoint of this "
        "program. Without --resume, --overwrite starts afresh"
    )


def test_without_a_checkpoint_the_run_starts_afresh_and_says_so(spec, small_product, output):
    product, events = resumed(spec, output)
    assert events["no checkpoint"] == "there is no checkpoint of out.nc: starting afresh"
    assert product.attrs["data_checksum"] == small_product.attrs["data_checksum"]


@pytest.mark.parametrize(
    ("change", "reason"),
    [
        ("ensemble.seed=7", "belongs to another run: another scene, seed or number of particles per batch"),
        (
            "release[1].rate=1e20 s-1",
            "belongs to another run: another scene, seed or number of particles per batch",
        ),
        ("ensemble.replicates=2", "keeps 3 replicates where this run keeps 2"),
    ],
)
def test_a_checkpoint_of_another_run_is_refused_and_kept(small_run_file, spec, output, change, reason):
    interrupt(spec, output, 2)
    before = {path: path.read_bytes() for path in Checkpoints(output).existing()}
    with pytest.raises(InputError) as refusal:
        resumed(load_run(small_run_file, [change]), output)
    expected = f"out.nc: its checkpoint {reason}. Without --resume, --overwrite starts afresh"
    assert str(refusal.value) == expected
    assert {path: path.read_bytes() for path in Checkpoints(output).existing()} == before


def test_a_checkpoint_with_more_batches_than_asked_for_is_refused(small_run_file, spec, output):
    interrupt(spec, output, 5)
    with pytest.raises(InputError, match="its checkpoint holds 5 batches, more than the run asks for"):
        resumed(load_run(small_run_file, ["ensemble.batches=4"]), output)


def test_a_run_is_made_longer_from_its_checkpoint(small_run_file, spec, output):
    interrupt(spec, output, 5)
    longer = load_run(small_run_file, ["ensemble.batches=8"])
    product, _ = resumed(longer, output)
    assert product.attrs["data_checksum"] == run(longer, workers=1).attrs["data_checksum"]


def test_a_share_is_resumed_as_a_share(spec, output):
    share = BatchRange(2, 6)
    interrupt(spec, output, 2, batches=share)
    with pytest.raises(InputError, match="begins with batch 2 where this run begins with 0"):
        resumed(spec, output)
    product, _ = resumed(spec, output, batches=share)
    assert product.attrs["data_checksum"] == run(spec, 1, batches=share).attrs["data_checksum"]


def test_checkpoints_are_written_often_but_cheaply(output, monkeypatch):
    clock = [0.0]
    monkeypatch.setattr(checkpoint_slots, "perf_counter", lambda: clock[0])
    written = []

    class Folder:
        folded = 1
        statistics = (None,)

    checkpoints = Checkpoints(output)
    checkpoints._begun = checkpoint_slots.Begun(None, Folder(), 0.0)
    for cost, interval in ((0.0, 5.0), (0.05, 5.0), (0.4, 20.0), (30.0, 60.0)):
        # Dear checkpoints come seldom, so that they take 2 % of the time; but a minute is the most that may be lost.
        monkeypatch.setattr(checkpoints, "write", lambda: written.append(clock[0]))
        checkpoints._cost, checkpoints._written = cost, clock[0]
        clock[0] += interval - 0.01
        checkpoints.after_fold()
        assert written == []
        clock[0] += 0.02
        checkpoints.after_fold()
        assert len(written) == 1
        written.clear()
