"""Products of shares, put together, are the product of the whole run."""

from itertools import pairwise

import numpy as np
import pytest
import xarray as xr

from tracer.engine.runspec.load import load_run
from tracer.engine.tasks import BatchRange
from tracer.engine.tracing import run
from tracer.errors import InputError
from tracer.product.merging import merged_product
from tracer.product.reading import open_product
from tracer.product.writing import save_product

TWELVE = "ensemble.batches=12"


@pytest.fixture(scope="module")
def whole(small_light_run_file) -> xr.Dataset:
    """Return the product of 12 batches in sunlight, with lines, images and 3 replicates."""
    return run(load_run(small_light_run_file, [TWELVE]), workers=1)


@pytest.fixture(scope="module")
def share(small_light_run_file, tmp_path_factory):
    """Return a function that gives the opened product of some batches, changed by settings."""
    folder = tmp_path_factory.mktemp("shares")
    opened: dict[tuple, tuple[str, xr.Dataset]] = {}

    def make(first: int, stop: int, *settings: str) -> tuple[str, xr.Dataset]:
        key = (first, stop, *settings)
        if key not in opened:
            path = folder / f"{len(opened)}.nc"
            spec = load_run(small_light_run_file, [TWELVE, *settings])
            save_product(run(spec, workers=1, batches=BatchRange(first, stop)), path)
            opened[key] = (path.name, open_product(path))
        return opened[key]

    yield make
    for _, ds in opened.values():
        ds.close()


def assert_same(merged: xr.Dataset, whole: xr.Dataset, replicates: bool = True) -> None:
    assert set(merged.variables) == set(whole.variables)
    for name in whole.variables:
        found, expected = merged[name].values, whole[name].values
        if str(name).endswith("_replicates"):
            # Single precision: 24 bits in each share, and as many in the sum.
            if replicates:
                largest = np.abs(expected).max()
                np.testing.assert_allclose(found, expected, rtol=3e-7, atol=1e-9 * largest, err_msg=name)
        elif str(name).endswith("_standard_error"):
            np.testing.assert_allclose(found, expected, rtol=1e-6, err_msg=name)
        elif expected.dtype.kind == "f":
            np.testing.assert_allclose(found, expected, rtol=1e-12, err_msg=name)
        else:
            assert np.array_equal(found, expected)


CUTS = [(0, 6, 12), (0, 3, 12), (0, 5, 7, 12), (0, 1, 12), (0, 2, 4, 6, 8, 10, 12)]


@pytest.mark.parametrize("cuts", CUTS, ids=str)
def test_merged_shares_equal_the_whole_run(share, whole, cuts):
    merged = merged_product([share(*ends) for ends in pairwise(cuts)])
    assert_same(merged, whole)
    for name in ("run_hash", "scene_hash", "batches", "batch_ranges", "flights", "integration_steps", "seed"):
        assert merged.attrs[name] == whole.attrs[name], name
    for name in ("replicate_batches", "share_beyond_line_tables"):
        np.testing.assert_allclose(merged.attrs[name], whole.attrs[name], rtol=1e-12)
    assert merged.attrs["kernel_seconds"] > 0.0


def test_the_order_of_the_products_does_not_count(share, tmp_path):
    shares = [share(0, 5), share(5, 7), share(7, 12)]
    save_product(merged_product(shares), tmp_path / "forth.nc")
    save_product(merged_product(shares[::-1]), tmp_path / "back.nc")
    with open_product(tmp_path / "forth.nc") as forth, open_product(tmp_path / "back.nc") as back:
        assert forth.attrs["data_checksum"] == back.attrs["data_checksum"]


def test_merged_products_are_merged_again(share, whole, tmp_path):
    save_product(merged_product([share(0, 3), share(9, 12)]), tmp_path / "ends.nc")
    with open_product(tmp_path / "ends.nc") as ends:
        assert ends.attrs["batch_ranges"] == "seed 20310601 batches 0:3; seed 20310601 batches 9:12"
        merged = merged_product([("ends.nc", ends), share(3, 9)])
        assert_same(merged, whole)
        assert merged.attrs["batch_ranges"] == "seed 20310601 batches 0:12"
        with pytest.raises(InputError, match=r"ends.nc: seed 20310601 batches 9:12 are in .* already"):
            merged_product([share(9, 12), ("ends.nc", ends)])


def test_other_seeds_make_smaller_errors(share):
    merged = merged_product([share(0, 12), share(0, 12, "ensemble.seed=5")])
    assert merged.attrs["batches"] == 24
    assert merged.attrs["seed"].tolist() == [5, 20310601]
    assert merged.attrs["batch_ranges"] == "seed 5 batches 0:12; seed 20310601 batches 0:12"
    halves = [share(0, 12)[1], share(0, 12, "ensemble.seed=5")[1]]
    expected = 0.5 * sum(one["mean_life"].values for one in halves)
    np.testing.assert_allclose(merged["mean_life"].values, expected, rtol=1e-14)
    errors = merged["mean_life_standard_error"] / halves[0]["mean_life_standard_error"]
    # One over the root of two, known to some 15 % from 12 batches each.
    assert (np.abs(errors - 0.71) < 0.3).all()


def test_products_without_replicates_merge_into_one_without(share, whole):
    merged = merged_product([share(0, 6), share(6, 12, "ensemble.replicates=0")])
    assert "number_density_replicates" not in merged
    assert "replicate_batches" not in merged.attrs
    np.testing.assert_allclose(merged["number_density"], whole["number_density"], rtol=1e-12)


def test_nothing_is_computed_before_it_is_read(share):
    merged = merged_product([share(0, 6), share(6, 12)])
    assert not merged["number_density"].variable._in_memory


def refusal(*shares) -> str:
    with pytest.raises(InputError) as refused:
        merged_product(shares)
    return str(refused.value)


def test_the_same_batches_twice_are_refused(share):
    one, other = share(0, 6), share(5, 7)
    assert (
        refusal(one, other)
        == f"{other[0]}: seed 20310601 batches 5:6 are in {one[0]} already; no batch counts twice"
    )
    assert "batches 0:6 are in" in refusal(one, one)


def test_another_scene_is_refused_by_the_keys_that_differ(share):
    one, other = share(0, 6), share(6, 12, "release[2].rate=3e23 s-1", "surface.sticking=0.5")
    assert refusal(one, other) == (
        f"{other[0]}: is of another scene than {one[0]}; they differ in "
        'release[2].rate ("5e23 s-1" and "3e23 s-1"), surface.sticking (0.4 and 0.5)'
    )


def test_batches_of_another_size_are_refused(share):
    one, other = share(0, 6), share(6, 8, "ensemble.particles_per_batch=100")
    assert refusal(one, other) == (
        f"{other[0]}: has 100 particles per batch, {one[0]} 250; only batches of one size can be merged"
    )


def test_another_version_is_refused(share):
    name, ds = share(6, 12)
    older = ds.assign_attrs(source="exosphere-tracer 0.0.1")
    assert "made by exosphere-tracer 0.0.1, " in refusal(share(0, 6), (name, older))


def test_changed_data_are_refused(share):
    name, ds = share(6, 12)
    changed = ds.assign(mean_life=ds.mean_life * 2.0)
    assert refusal(share(0, 6), (name, changed)) == (
        f"{name}: its data do not match its data_checksum; the file was changed or damaged"
    )


@pytest.mark.parametrize(
    "text", ["", "all", "seed 1 batches 4:4", "seed 1 batches 0:6; ", "seed -1 batches 0:6"]
)
def test_a_product_that_does_not_say_its_batches_is_refused(share, text):
    name, ds = share(6, 12)
    silent = ds.assign_attrs(batch_ranges=text)
    assert refusal(share(0, 6), (name, silent)).startswith(f"{name}: does not say which batches it holds")
