"""A sweep holds what its points' runs make, to the last bit, however often it was interrupted."""

import os
from pathlib import Path

import numpy as np
import pytest

import tracer
from tracer.engine.checkpoint_slots import Checkpoints
from tracer.engine.executors import threads
from tracer.engine.runspec.load import load_run, parse_run
from tracer.engine.sweep import preparing, tracing
from tracer.engine.sweep.points import sweep_points
from tracer.engine.sweep.store import PointStore
from tracer.engine.sweep.tracing import SweepInterrupted, SweepStopped, run_sweep
from tracer.errors import InputError, TracerError
from tracer.product.checksum import data_checksum
from tracer.product.reading import open_product, open_sweep
from tracer.product.sweeping import sweep_point

TEXT = Path(__file__).with_name("two-axes.toml").read_text(encoding="utf-8")


class Stopped(KeyboardInterrupt):
    """What ends a sweep here, as Ctrl-C would."""


@pytest.fixture
def output(tmp_path):
    return tmp_path / "out.nc"


@pytest.fixture
def events():
    return []


@pytest.fixture
def note(events):
    return lambda event, text, **facts: events.append((event, text, facts))


@pytest.fixture(scope="module")
def whole(tmp_path_factory, small_run_file):
    """Return the sweep of `TEXT` that nothing happened to, and its checksum."""
    folder = tmp_path_factory.mktemp("whole")
    (folder / "small.toml").write_bytes(small_run_file.read_bytes())
    (folder / "sweep.toml").write_text(TEXT, encoding="utf-8")
    sweep = tracer.load_sweep(folder / "sweep.toml")
    assert run_sweep(sweep, folder / "out.nc", 1)
    with open_sweep(folder / "out.nc") as ds:
        return folder / "out.nc", ds.attrs["data_checksum"]


def values_of(ds):
    """Return all that tracing decides in a sweep's product: not how long it took."""
    fast = ("_seconds", "point_attributes")
    return {name: ds[name].values for name in map(str, ds.variables) if not name.endswith(fast)}


def same(one, other) -> bool:
    return one.keys() == other.keys() and all(
        np.array_equal(one[name], other[name], equal_nan=one[name].dtype.kind == "f") for name in one
    )


def test_each_point_is_the_run_of_its_settings_to_the_last_bit(whole, sweep_of, tmp_path):
    path, _ = whole
    with open_sweep(path) as ds:
        for point in sweep_points(sweep_of(TEXT)):
            alone = tracer.run(
                load_run(tmp_path / "small.toml", (*point.settings, "ensemble.batches=4")), workers=2
            )
            one = sweep_point(ds, point.number)
            assert data_checksum(one) == one.attrs["data_checksum"] == alone.attrs["data_checksum"]
            for name in ("run_hash", "scene_hash", "run_file", "flights", "batch_ranges", "body_radius"):
                assert one.attrs[name] == alone.attrs[name]
            for name in alone.variables:
                assert one[name].dims == alone[name].dims
                assert one[name].attrs.keys() == alone[name].attrs.keys()


def test_a_point_is_traced_again_from_the_run_file_inside_it(whole):
    with open_sweep(whole[0]) as ds:
        one = sweep_point(ds, 5)
        again = tracer.run(parse_run(one.attrs["run_file"], "point.toml"), workers=1)
        assert again.attrs["data_checksum"] == one.attrs["data_checksum"]


def test_points_would_differ_if_they_were_put_in_another_order(whole):
    with open_sweep(whole[0]) as ds:
        sums = {sweep_point(ds, number).attrs["data_checksum"] for number in range(1, 7)}
        assert len(sums) == 6


def test_a_point_that_is_taken_out_is_saved_as_the_product_of_a_run(whole, tmp_path):
    with open_sweep(whole[0]) as ds:
        tracer.save_product(sweep_point(ds, 2), tmp_path / "point.nc")
        expected = sweep_point(ds, 2).attrs["data_checksum"]
    with open_product(tmp_path / "point.nc") as one:
        assert one.attrs["data_checksum"] == expected
        assert float(one.ledger.sel(release="sputtering").sum()) == pytest.approx(5e23, rel=1e-9)


def test_swept_dimensions_lead_and_points_say_what_they_are(whole):
    with open_sweep(whole[0]) as ds:
        assert ds.ledger.dims == ("sticking", "temperature", "release", "fate")
        assert ds.number_density_replicates.dims[:3] == ("sticking", "temperature", "replicate")
        assert ds.cell_volume.dims == ("altitude", "latitude")
        assert ds.temperature.values.tolist() == [600.0, 1200.0, 2400.0]
        assert ds.temperature.attrs["units"] == "K"
        assert ds.point_run_hash.dims == ("sticking", "temperature")
        assert (ds.point_flights > 0).all()
        assert int(ds.point_flights.sum()) == ds.attrs["flights"]
        assert float(ds.ledger.sel(sticking=0.2, temperature=600.0, fate="escaped").sum()) > 0.0


@pytest.mark.parametrize("workers", [1, 3])
def test_sweep_is_the_same_for_any_number_of_workers(whole, sweep_of, output, workers):
    run_sweep(sweep_of(TEXT), output, workers)
    with open_sweep(whole[0]) as one, open_sweep(output) as other:
        assert same(values_of(one), values_of(other))


def test_paired_axes_share_a_dimension(sweep_of, output):
    text = TEXT.replace("[sweep]", '[sweep]\ncombine = "paired"').replace("[0.2, 1.0]", "[0.2, 1.0, 0.2]")
    run_sweep(sweep_of(text), output, 1)
    with open_sweep(output) as ds:
        assert ds.ledger.dims == ("point", "release", "fate")
        assert ds.sticking.dims == ds.temperature.dims == ("point",)
        assert ds.sticking.values.tolist() == [0.2, 1.0, 0.2]


def test_points_that_a_rule_ends_keep_their_own_number_of_batches(sweep_of, output):
    stop = '{ variable = "number_density", relative_error = 0.02, at_most_batches = 40 }'
    text = TEXT.replace("batches = 4", f"batches = 4\nparticles_per_batch = 100\nstop = {stop}")
    run_sweep(sweep_of(text), output, 2)
    with open_sweep(output) as ds:
        assert set(ds.point_batches.values.ravel()) <= {20.0, 40.0}
        assert set(ds.point_stop_reached.values.ravel()) <= {0.0, 1.0}
        assert (ds.point_stop_relative_error > 0.0).all()
        one = sweep_point(ds, 4)
        assert data_checksum(one) == one.attrs["data_checksum"]


def interrupted(sweep, output, point: int, batches: int = 1, **options):
    """Trace until so many batches of a point are folded."""

    def watch(status):
        if status.part.startswith(f"point {point} ") and status.batches >= batches:
            raise Stopped

    with pytest.raises(SweepInterrupted) as stop:
        run_sweep(sweep, output, 1, watch, **options)
    return stop.value.kept


@pytest.fixture
def eager(monkeypatch):
    """Let checkpoints be written at every fold."""
    monkeypatch.setattr("tracer.engine.checkpoint_slots.SHORTEST_INTERVAL", 0.0)
    monkeypatch.setattr("tracer.engine.checkpoint_slots.COST_SHARE", 1e9)


def test_an_interrupted_sweep_goes_on_within_its_point_and_is_the_same(
    whole, sweep_of, output, eager, events, note
):
    sweep = sweep_of(TEXT)
    kept = interrupted(sweep, output, 2)
    assert (kept.points, kept.number) == (1, 2)
    assert kept.batches >= 1
    assert not output.exists()
    assert interrupted(sweep, output, 3, 2, resume=True).points == 2
    assert run_sweep(sweep, output, 2, resume=True, note=note)
    words = [text for event, text, _ in events if event == "resumed"]
    assert words[0].endswith(" of 6 points are finished already")
    assert any(text.startswith("going on from the checkpoint at batch ") for text in words[1:])
    with open_sweep(whole[0]) as one, open_sweep(output) as other:
        assert same(values_of(one), values_of(other))
    assert sorted(entry.name for entry in output.parent.iterdir()) == ["out.nc", "small.toml", "sweep.toml"]


def test_what_an_interrupted_sweep_has_left_is_not_destroyed_unasked(sweep_of, output):
    sweep = sweep_of(TEXT)
    interrupted(sweep, output, 2)
    before = sorted(PointStore(output).folder.iterdir())
    with pytest.raises(
        InputError, match="has left finished points or checkpoints; --resume goes on from them"
    ):
        run_sweep(sweep, output, 1)
    assert sorted(PointStore(output).folder.iterdir()) == before
    assert run_sweep(sweep, output, 1, overwrite=True)
    assert not PointStore(output).folder.exists()


def test_values_added_to_a_sweep_are_all_that_is_traced(sweep_of, output, events, note):
    interrupted(sweep_of(TEXT), output, 6)
    longer = sweep_of(TEXT.replace("[0.2, 1.0]", "[0.1, 0.2, 1.0]"))
    assert run_sweep(longer, output, 1, resume=True, note=note)
    assert ("resumed", "5 of 9 points are finished already", {"points": 5}) in events
    assert sum(event == "point" for event, _, _ in events) == 4


def test_a_damaged_point_is_traced_again(whole, sweep_of, output, events, note):
    sweep = sweep_of(TEXT)
    interrupted(sweep, output, 4)
    points = sorted(PointStore(output).folder.glob("*.nc"))
    assert len(points) == 3
    content = bytearray(points[0].read_bytes())
    points[0].write_bytes(content[: len(content) // 2])
    run_sweep(sweep, output, 1, resume=True, note=note)
    assert any(event == "damaged point" for event, _, _ in events)
    with open_sweep(whole[0]) as one, open_sweep(output) as other:
        assert same(values_of(one), values_of(other))


def test_points_of_another_version_are_refused_and_kept(sweep_of, output, monkeypatch):
    sweep = sweep_of(TEXT)
    interrupted(sweep, output, 2)
    monkeypatch.setattr("tracer.engine.sweep.store.package_version", lambda: "9.9")
    with pytest.raises(InputError, match="all points of a sweep are made by one version"):
        run_sweep(sweep, output, 1, resume=True)
    assert PointStore(output).exists()


def test_the_same_sweep_is_not_made_twice(sweep_of, output):
    text = TEXT.replace("count = 3", "count = 2").replace("[0.2, 1.0]", "[0.2]")
    assert run_sweep(sweep_of(text), output, 1)
    content = output.read_bytes()
    assert not run_sweep(sweep_of(text), output, 1, resume=True)
    with pytest.raises(InputError, match="exists; --overwrite replaces it"):
        run_sweep(sweep_of(text.replace("2400", "2500")), output, 1, resume=True)
    with pytest.raises(InputError, match="exists; --overwrite replaces it"):
        run_sweep(sweep_of(text), output, 1)
    assert output.read_bytes() == content


def test_a_point_that_fails_says_which_and_keeps_the_others(sweep_of, output, monkeypatch):
    honest = tracing.run

    def failing(spec, *arguments, **options):
        if spec.surface.sticking == 1.0:
            raise TracerError("the particle budget does not close")
        return honest(spec, *arguments, **options)

    monkeypatch.setattr(tracing, "run", failing)
    with pytest.raises(SweepStopped) as stop:
        run_sweep(sweep_of(TEXT), output, 1)
    assert str(stop.value).endswith(
        "sweep.toml: point 4 (sticking 1.0, temperature 600 K): the particle budget does not close"
    )
    assert stop.value.kept.points == 3
    assert stop.value.exit_code == 1


def test_too_little_memory_is_said_before_anything_is_traced(sweep_of, output, monkeypatch):
    monkeypatch.setattr(tracing, "available_memory", lambda: 1000)
    with pytest.raises(InputError, match=r"a point needs about .* GB of memory, 1e-06 GB is available"):
        run_sweep(sweep_of(TEXT), output, 1)
    assert not PointStore(output).folder.exists()


def test_progress_is_that_of_the_whole_sweep(sweep_of, output):
    seen = []
    run_sweep(sweep_of(TEXT), output, 1, seen.append)
    atoms = [status.atoms for status in seen]
    assert atoms == sorted(atoms)
    assert {status.atoms_expected for status in seen} == {6 * 4 * 250 * 2}
    assert atoms[-1] == pytest.approx(seen[-1].atoms_expected)
    assert list(dict.fromkeys(status.part for status in seen)) == [f"point {i} of 6" for i in range(1, 7)]


def test_every_point_runs_on_the_executor_that_is_given(sweep_of, output):
    works = []

    def counting(work, *arguments):
        works.append(work)
        return threads.map_batches(work, *arguments)

    run_sweep(sweep_of(TEXT), output, 2, executor=counting)
    assert len(works) == 6


def test_points_that_are_the_same_run_are_traced_once(sweep_of, output, events, note):
    text = TEXT.replace('"surface.sticking"', '"title"').replace("[0.2, 1.0]", '["one", "two"]')
    run_sweep(sweep_of(text.replace('key = "title"', 'key = "title"\nname = "words"')), output, 1, note=note)
    assert sum(event == "point" for event, _, _ in events) == 3


def test_memory_is_that_of_a_point_and_not_of_the_sweep(sweep_of):
    small = preparing.prepare_sweep(sweep_of(TEXT), 1)
    large = preparing.prepare_sweep(sweep_of(TEXT.replace("count = 3", "count = 30")), 1)
    assert large.memory == small.memory
    assert large.product_size == 10 * small.product_size


def test_checkpoints_of_points_lie_in_the_folder_of_points(sweep_of, output, eager):
    interrupted(sweep_of(TEXT), output, 2)
    folder = PointStore(output).folder
    assert folder.name == ".out.nc.points"
    identity = preparing.prepare_sweep(sweep_of(TEXT), 1).points[1].identity
    assert Checkpoints(PointStore(output).path(identity)).existing()
    assert os.listdir(folder)
