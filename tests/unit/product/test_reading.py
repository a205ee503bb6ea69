import netCDF4
import numpy as np
import pytest
import xarray as xr

from tracer.errors import InputError
from tracer.product.checksum import data_checksum
from tracer.product.reading import open_product
from tracer.product.writing import save_product


@pytest.fixture
def saved(product, tmp_path):
    path = tmp_path / "harrow.nc"
    save_product(product, path)
    return path


def refusal_of(path):
    with pytest.raises(InputError) as refusal:
        open_product(path)
    return str(refusal.value)


def test_opened_product_equals_the_one_that_was_saved(product, saved):
    with open_product(saved) as ds:
        assert data_checksum(ds) == data_checksum(product) == ds.data_checksum
        xr.testing.assert_equal(ds.load(), product)
        assert ds.ledger.sel(release="Verdampfung é", fate="escaped") == product.ledger[1, 1]
        for name, value in product.attrs.items():
            assert ds.attrs[name] == value


def test_a_dimension_of_lines_gets_its_index_too(product, tmp_path):
    lines = product.assign_coords(line_name=("line", ["na_5891", "na_5897"]))
    save_product(lines.assign(shine=("line", [1.0, 2.0])), tmp_path / "lines.nc")
    with open_product(tmp_path / "lines.nc") as ds:
        assert ds.shine.sel(line="na_5897") == 2.0


@pytest.mark.parametrize("load", [False, True])
def test_saving_an_opened_product_keeps_its_checksum(saved, tmp_path, load):
    with open_product(saved) as ds:
        save_product(ds.load() if load else ds, tmp_path / "copy.nc")
        with open_product(tmp_path / "copy.nc") as copy:
            assert copy.data_checksum == ds.data_checksum == data_checksum(copy)


# xarray takes a variable in "hours" or "seconds" for a duration when asked to; "h" and "s" stay numbers.
@pytest.mark.parametrize("decoding", [{}, {"decode_timedelta": True}])
def test_plain_xarray_opens_the_whole_file_as_numbers(saved, decoding):
    with xr.open_dataset(saved, **decoding) as ds:
        assert ds.mean_life.dtype == np.float64
        assert ds.local_time.dtype == np.float64
        assert all(ds[name].dtype.kind in "fOUT" for name in ds.variables)
        assert set(ds.ledger.coords) == {"release_name", "fate_name"}


def test_a_missing_file_is_refused(tmp_path):
    assert refusal_of(tmp_path / "no.nc") == f"{tmp_path / 'no.nc'}: no such file"


def test_a_folder_is_refused(tmp_path):
    assert refusal_of(tmp_path) == f"{tmp_path}: is a folder, not a product"


@pytest.mark.parametrize("content", [b"", b"title = 'Harrow'\n", b"CDF\x01" + b"\0" * 64])
def test_a_file_that_is_not_netcdf4_is_refused(tmp_path, content):
    path = tmp_path / "harrow.toml"
    path.write_bytes(content)
    assert refusal_of(path) == f"{path}: is not a netCDF-4 file"


def test_a_netcdf_file_that_is_not_a_product_is_refused(tmp_path):
    path = tmp_path / "map.nc"
    xr.Dataset({"albedo": ("x", [0.1, 0.2])}, attrs={"product_version": 1}).to_netcdf(path)
    assert refusal_of(path) == f"{path}: is not a product of this program"


@pytest.mark.parametrize("share", [0.05, 0.5, 0.95, 0.9999])
def test_a_file_cut_short_is_refused(saved, share):
    whole = saved.read_bytes()
    saved.write_bytes(whole[: int(share * len(whole))])
    assert refusal_of(saved).startswith(f"{saved}: is damaged or cut short and cannot be read (")


def test_a_product_whose_writing_was_not_finished_is_refused(saved):
    with netCDF4.Dataset(saved, "a") as file:
        file.delncattr("complete")
    assert refusal_of(saved) == f"{saved}: is incomplete: writing it was not finished"


def test_a_product_of_a_later_version_is_refused(saved):
    with netCDF4.Dataset(saved, "a") as file:
        file.product_version = 2
    assert refusal_of(saved) == f"{saved}: is of product_version 2; this package reads version 1"
