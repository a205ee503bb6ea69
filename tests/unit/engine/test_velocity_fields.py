"""What a velocity-resolved image adds to a product, and that it changes nothing else."""

import numpy as np
import pytest

from tracer.engine.checkpoint_slots import Checkpoints
from tracer.engine.memory import sizes
from tracer.engine.planning import make_plan
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.engine.tracing import run
from tracer.product.reading import open_product
from tracer.product.writing import save_product

STEM = "tail_from_north"
VELOCITY = 'image[1].velocity={ from = "-1 km/s", to = "2 km/s", bins = 5 }'


@pytest.fixture(scope="module", params=["small_run_file", "small_light_run_file"])
def run_file(request):
    return request.getfixturevalue(request.param)


@pytest.fixture(scope="module")
def resolved(run_file):
    return run(load_run(run_file, [VELOCITY]), workers=1)


def test_all_else_is_the_same_to_the_last_bit(run_file, resolved):
    plain = run(load_run(run_file), workers=1)
    for name in plain.variables:
        assert np.array_equal(
            plain[name].values, resolved[name].values, equal_nan=plain[name].dtype.kind == "f"
        )
    added = {str(name) for name in resolved.variables} - {str(name) for name in plain.variables}
    assert all("velocity" in name or name.startswith(("line_shift", "line_width")) for name in added)
    assert f"column_by_velocity_{STEM}" in added


def test_bins_and_what_lies_outside_are_the_plain_image(resolved):
    kinds = ("column", "brightness") if "line_name" in resolved else ("column",)
    for kind in kinds:
        for ending in ("", "_replicates"):
            bins = resolved[f"{kind}_by_velocity_{STEM}{ending}"].sum(f"{STEM}_velocity", dtype=np.float64)
            outside = resolved[f"{kind}_outside_velocity_{STEM}{ending}"]
            plain = resolved[f"{kind}_{STEM}{ending}"]
            # Sums of the same numbers in another order: a rounding each, single precision in the replicates.
            rounding = 1e-6 if ending else 1e-13
            np.testing.assert_allclose(bins + outside, plain, rtol=rounding, atol=0.0)
            assert (outside > 0.0).any()
            assert (bins > 0.0).any()


def test_velocities_have_their_axis(resolved):
    axis = resolved[f"{STEM}_velocity"]
    np.testing.assert_allclose(axis, [-700.0, -100.0, 500.0, 1100.0, 1700.0])
    assert axis.attrs["units"] == "m s-1"
    np.testing.assert_allclose(resolved[f"{STEM}_velocity_bounds"][0], [-1000.0, -400.0])


def test_never_hit_pixels_are_not_numbers_and_others_are(resolved):
    hit = (resolved[f"column_{STEM}"] > 0.0).values
    assert hit.any()
    for name in (f"mean_velocity_{STEM}", f"velocity_width_{STEM}"):
        assert np.array_equal(np.isfinite(resolved[name].values), hit)
        # Three replicates are too few for an error.
        assert np.isnan(resolved[name + "_standard_error"].values).all()


class Stopped(Exception):
    pass


def test_resumed_velocities_are_those_of_an_uninterrupted_run(run_file, resolved, tmp_path):
    spec, output = load_run(run_file, [VELOCITY]), tmp_path / "out.nc"
    checkpoints = Checkpoints(output)

    def watch(status):
        if status.batches >= 2:
            checkpoints.write()
            raise Stopped

    with pytest.raises(Stopped):
        run(spec, workers=1, watch=watch, checkpoints=checkpoints)
    again = run(spec, workers=1, checkpoints=Checkpoints(output, True))
    assert again.attrs["data_checksum"] == resolved.attrs["data_checksum"]


def test_saved_velocities_and_those_of_two_workers_are_the_same(run_file, resolved, tmp_path):
    save_product(resolved, tmp_path / "one.nc")
    with open_product(tmp_path / "one.nc") as ds:
        assert ds.attrs["data_checksum"] == resolved.attrs["data_checksum"]
        ds.load()
    again = run(load_run(run_file, [VELOCITY]), workers=2)
    assert again.attrs["data_checksum"] == resolved.attrs["data_checksum"]


def test_memory_counts_the_bins(run_file):
    few, many = (
        make_plan(spec, build_scene(spec))
        for spec in (load_run(run_file), load_run(run_file, [VELOCITY.replace("= 5", "= 1000")]))
    )
    pixels, replicates, releases = 48, 3, 2
    lines = len(few.scene.lines)
    more = 1003 * pixels * (1 + lines) * releases * (2 * 8 + 4 * replicates)
    assert sizes(many, 1).product - sizes(few, 1).product == more
    assert sizes(many, 1).memory > sizes(few, 1).memory + more


def test_velocities_without_replicates_have_no_errors(run_file):
    ds = run(load_run(run_file, [VELOCITY, "ensemble.replicates=0"]), workers=1)
    assert f"mean_velocity_{STEM}_replicates" not in ds
    assert np.isnan(ds[f"mean_velocity_{STEM}_standard_error"]).all()
