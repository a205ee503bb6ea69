"""Responses by bins of launch speed: kept beside the run, by any workers, through shares and stops."""

import numpy as np
import pytest
import xarray as xr

from tracer.engine.batches import Task, make_work, trace_batch
from tracer.engine.checkpoint_slots import Checkpoints
from tracer.engine.memory import refuse_what_does_not_fit, sizes
from tracer.engine.planning import make_plan
from tracer.engine.responses import trace_responses
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.engine.tasks import BatchRange
from tracer.engine.tracing import run
from tracer.errors import InputError
from tracer.kernels.resume import new_resume
from tracer.kernels.tracing import trace_slice
from tracer.observe.responses import evaluate_law
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.product.merging import merged_product
from tracer.product.reading import open_product
from tracer.product.writing import save_product
from tracer.tally.budget import budget_gap

BINS = "ensemble.speed_bins=8"
FIELDS = ("vertical_column", "column_tail_from_north")


@pytest.fixture(scope="module")
def responding(small_run_file) -> xr.Dataset:
    return run(load_run(small_run_file, [BINS]), workers=2)


def test_all_else_of_a_run_stays_the_same_to_the_last_bit(responding, small_product):
    for name, variable in small_product.variables.items():
        assert responding.variables[name].identical(variable), name
    added = set(map(str, responding.variables)) - set(map(str, small_product.variables))
    assert added == {"launch_speed", "launch_speed_bounds"} | {
        name + ending
        for name in ("vertical_column_response", "column_response_tail_from_north")
        for ending in ("", "_standard_error", "_replicates")
    }


def test_bins_of_speed_and_of_velocity_do_not_disturb_each_other(responding, small_run_file):
    velocity = [f"image[1].velocity.{key}" for key in ("from=-2 km/s", "to=2 km/s", "bins=3")]
    resolved = run(load_run(small_run_file, velocity), workers=1)
    both = run(load_run(small_run_file, [BINS, *velocity]), workers=1)
    assert float(resolved.column_by_velocity_tail_from_north.sum()) > 0.0
    for alone in (responding, resolved):
        for name, variable in alone.variables.items():
            assert both.variables[name].identical(variable), name
    assert set(both.variables) == set(responding.variables) | set(resolved.variables)
    # Kernels write where the world says, and check no bounds.
    work = make_work(build_scene(load_run(small_run_file, [BINS, *velocity])), 1, 100)
    assert work.world.images.velocities.resolved
    assert not work.responses.world.images.velocities.resolved


def test_scene_hash_knows_of_the_bins(responding, small_product):
    assert responding.attrs["scene_hash"] != small_product.attrs["scene_hash"]


def test_product_does_not_depend_on_the_workers(responding, small_run_file):
    again = run(load_run(small_run_file, [BINS]), workers=1)
    assert again.attrs["data_checksum"] == responding.attrs["data_checksum"]


def test_emphasis_on_far_leaves_responses_alone(responding, small_run_file):
    far = run(load_run(small_run_file, [BINS, "ensemble.emphasis=far"]), workers=1)
    for name in ("vertical_column_response", "column_response_tail_from_north_replicates"):
        assert far[name].variable.equals(responding[name].variable)


def test_bins_end_at_escape_and_are_bounded(responding):
    bounds = responding.launch_speed_bounds.values
    assert np.array_equal(bounds[1:, 0], bounds[:-1, 1])
    assert np.array_equal(responding.launch_speed.values, bounds.mean(axis=1))
    # sqrt(2 gm/R) of Harrow.
    assert responding.attrs["escape_speed"] == pytest.approx(np.sqrt(2.0 * 9500e9 / 1800e3), rel=1e-15)
    assert responding.attrs["escape_speed"] in bounds


def test_responses_outlive_file_shares_and_merging(responding, small_run_file, tmp_path):
    spec = load_run(small_run_file, [BINS])
    products = []
    for number, share in enumerate((BatchRange(0, 2), BatchRange(2, 6))):
        path = tmp_path / f"{number}.nc"
        save_product(run(spec, workers=1, batches=share), path)
        products.append((str(path), open_product(path)))
    merged = merged_product(products)
    for name in map(str, responding.data_vars):
        if "_response" in name and not name.endswith("_replicates"):
            error = np.nan_to_num(responding[name + "_standard_error"].values) if "error" not in name else 0.0
            assert np.allclose(
                merged[name], responding[name], rtol=1e-9, atol=1e-9 * np.max(error), equal_nan=True
            )
    law = MaxwellFlux(3000.0)
    ours, theirs = evaluate_law(merged, "impact vapour", law), evaluate_law(responding, "impact vapour", law)
    for name in FIELDS:
        assert np.allclose(ours[name], theirs[name], rtol=1e-9)
    for _, product in products:
        product.close()


def test_resumed_run_equals_uninterrupted_run(responding, small_run_file, tmp_path):
    spec = load_run(small_run_file, [BINS])
    path = tmp_path / "product.nc"

    checkpoints = Checkpoints(path)

    def stop_midway(status) -> None:
        if status.batches >= 2:
            checkpoints.write()
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        run(spec, workers=1, watch=stop_midway, checkpoints=checkpoints)
    assert checkpoints.kept_batches >= 2
    resumed = run(spec, workers=1, checkpoints=Checkpoints(path, resume=True))
    assert resumed.attrs["data_checksum"] == responding.attrs["data_checksum"]


def test_memory_counts_responses(small_run_file):
    def plan(*settings: str):
        spec = load_run(small_run_file, settings)
        return make_plan(spec, build_scene(spec))

    without, bare = sizes(plan("ensemble.replicates=0"), 1), sizes(plan("ensemble.replicates=0", BINS), 1)
    # Two releases, two numbers each; 8 bins of 2 orders for 4 x 6 columns and 8 x 6 pixels.
    assert bare.product - without.product == 2 * 2 * 8 * 8 * 2 * (24 + 48)
    kept = sizes(plan("ensemble.replicates=3", BINS), 1).product
    assert kept - bare.product > 2 * 3 * 4 * 8 * 2 * (24 + 48)
    with pytest.raises(InputError, match="ask for fewer cells, pixels, speed bins, replicates or workers"):
        refuse_what_does_not_fit(plan(BINS), 1, available=1000)


@pytest.mark.parametrize("bins", ["7", "-1", "257", "8.0", "true"])
def test_odd_numbers_of_bins_are_refused(small_run_file, bins):
    with pytest.raises(
        InputError, match=r"ensemble.speed_bins: .*must be a whole number from 8 to 256, or 0"
    ):
        load_run(small_run_file, [f"ensemble.speed_bins={bins}"])


def test_images_whose_responses_would_collide_are_refused(small_run_file):
    text = small_run_file.read_text(encoding="utf-8")
    image = text[text.index("[[image]]") : text.index("[ensemble]")]
    other = image.replace("tail from north", "response tail from north")
    path = small_run_file.with_name("colliding.toml")
    path.write_text(text.replace("[ensemble]", other + "[ensemble]"), encoding="utf-8")
    build_scene(load_run(path))
    with pytest.raises(InputError, match=r"names collide in the product: .*column_response_tail_from_north"):
        build_scene(load_run(path, [BINS]))


def test_few_particles_still_reach_every_bin(small_run_file):
    work = make_work(build_scene(load_run(small_run_file, [BINS])), 1, 2)
    assert work.responses is not None
    assert work.responses.counts.min() >= 1
    assert work.launches == 2 + work.responses.launches
    told = []
    trace_batch(work, Task(0, 0), lambda atoms, _flights: told.append(atoms), lambda: False)
    assert sum(told) == pytest.approx(work.launches)


def test_each_bin_has_a_unit_rate_whose_budget_closes(small_light_run_file):
    work = make_work(build_scene(load_run(small_light_run_file, [BINS])), 1, 80)
    assert work.responses is not None
    rates = []

    def fly(world, launches, tally, rng) -> None:
        trace_slice(world, launches, new_resume(1), tally, rng, 10**9)
        rate = launches.weights.sum()
        assert budget_gap(rate, tally.ledger, float(tally.roulette[0])) < 1e-9
        speeds = np.linalg.norm(launches.velocities, axis=1)
        at = np.searchsorted(work.responses.edges, speeds) - 1
        assert np.all(at == at[0])
        rates.append((int(at[0]), rate))

    trace_responses(work.scene, work.responses, work.layout, np.zeros(work.layout.size), (1, 1, 0), fly)
    # Falling and rising half of each bin.
    assert [at for at, _ in rates] == [at for at in range(8) for _ in range(2)]
    assert [rate for _, rate in rates] == pytest.approx([1.0] * 16, rel=1e-14)
