"""Means and widths of velocities of shares, put together, are those of the whole run."""

from itertools import pairwise

import numpy as np
import pytest

from tracer.engine.runspec.load import load_run
from tracer.engine.tasks import BatchRange
from tracer.engine.tracing import run
from tracer.product.merging import merged_product
from tracer.product.reading import open_product
from tracer.product.writing import save_product

SETTINGS = [
    "ensemble.batches=12",
    "ensemble.replicates=6",
    'image[1].velocity={ from = "-2 km/s", to = "4 km/s", bins = 4 }',
]
STEM = "tail_from_north"
RATIOS = [f"{name}_{STEM}" for name in ("mean_velocity", "velocity_width", "line_shift", "line_width")]


@pytest.fixture(scope="module")
def whole(small_light_run_file):
    return run(load_run(small_light_run_file, SETTINGS), workers=1)


@pytest.fixture(scope="module")
def share(small_light_run_file, tmp_path_factory):
    """Return a function that gives the opened product of some batches."""
    folder, opened = tmp_path_factory.mktemp("shares"), {}

    def make(first, stop, *settings):
        key = (first, stop, *settings)
        if key not in opened:
            path = folder / f"{len(opened)}.nc"
            spec = load_run(small_light_run_file, [*SETTINGS, *settings])
            save_product(run(spec, workers=1, batches=BatchRange(first, stop)), path)
            opened[key] = (path.name, open_product(path))
        return opened[key]

    yield make
    for _, ds in opened.values():
        ds.close()


# Groups of one batch go where the whole run has them; with six in each share they are put together by number.
@pytest.mark.parametrize("cuts", [(0, 6, 12), (0, 3, 12), (0, 2, 4, 6, 8, 10, 12)], ids=str)
def test_merged_velocities_are_those_of_the_whole_run(share, whole, cuts):
    merged = merged_product([share(*ends) for ends in pairwise(cuts)])
    assert set(merged.variables) == set(whole.variables)
    for name in RATIOS:
        np.testing.assert_allclose(merged[name], whole[name], rtol=1e-10, atol=1e-7, err_msg=name)
    for name in (f"column_by_velocity_{STEM}", f"brightness_outside_velocity_{STEM}"):
        np.testing.assert_allclose(merged[name], whole[name], rtol=1e-12, err_msg=name)
    if cuts in [(0, 6, 12), (0, 2, 4, 6, 8, 10, 12)]:
        for name in RATIOS:
            # Replicates are in single precision: 6e-8 of some km/s.
            found, expected = merged[name + "_replicates"], whole[name + "_replicates"]
            np.testing.assert_allclose(found, expected, rtol=1e-6, atol=0.01, err_msg=name)
            found, expected = merged[name + "_standard_error"], whole[name + "_standard_error"]
            np.testing.assert_allclose(found, expected, rtol=1e-3, atol=0.01, err_msg=name)


def test_merged_velocities_are_no_averages(share, whole):
    parts = [share(0, 3)[1], share(3, 12)[1]]
    average = 0.25 * parts[0][RATIOS[1]] + 0.75 * parts[1][RATIOS[1]]
    assert np.nanmax(np.abs(average.values - whole[RATIOS[1]].values)) > 1.0


def test_merged_velocities_are_written_and_merged_again(share, whole, tmp_path):
    save_product(merged_product([share(0, 3), share(9, 12)]), tmp_path / "ends.nc")
    with open_product(tmp_path / "ends.nc") as ends:
        merged = merged_product([("ends.nc", ends), share(3, 9)])
        for name in RATIOS:
            np.testing.assert_allclose(merged[name], whole[name], rtol=1e-10, atol=1e-7, err_msg=name)


def test_without_replicates_velocities_have_no_errors(share, whole):
    merged = merged_product([share(0, 6), share(6, 12, "ensemble.replicates=0")])
    for name in RATIOS:
        np.testing.assert_allclose(merged[name], whole[name], rtol=1e-10, atol=1e-7, err_msg=name)
        assert np.isnan(merged[name + "_standard_error"]).all()
