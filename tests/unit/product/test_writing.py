import errno
import os
import subprocess
import sys

import netCDF4
import numpy as np
import pytest
import xarray as xr

from tracer.errors import InputError, TracerError
from tracer.product.checksum import data_checksum
from tracer.product.reading import open_product
from tracer.product.writing import check_output, save_bytes, save_product


def test_saved_file_has_its_checksum_and_is_complete(product, tmp_path):
    save_product(product, tmp_path / "harrow.nc")
    with xr.open_dataset(tmp_path / "harrow.nc") as ds:
        assert ds.attrs["complete"] == 1
        assert len(ds.attrs["data_checksum"]) == 64
    assert [entry.name for entry in tmp_path.iterdir()] == ["harrow.nc"]


def test_variables_are_stored_as_the_layout_says(product, tmp_path):
    save_product(product, tmp_path / "harrow.nc")
    with netCDF4.Dataset(tmp_path / "harrow.nc") as file:
        density = file["number_density"]
        assert density.dtype == np.float64
        assert density.filters()["shuffle"]
        assert density.filters()["complevel"] == 1
        assert file["number_density_replicates"].dtype == np.float32
        assert file["release_name"].dtype is str
        assert file["number_density"].coordinates == "release_name"
        assert "release" not in file.variables
        for name in ("altitude", "altitude_bounds", "local_time", "tail_from_north_vertical"):
            assert "_FillValue" not in file[name].ncattrs()


def test_an_existing_file_is_kept_unless_it_may_be_overwritten(product, make_product, tmp_path):
    path = tmp_path / "harrow.nc"
    save_product(product, path)
    with pytest.raises(InputError) as refusal:
        save_product(make_product(title="second"), path)
    assert str(refusal.value) == f"{path}: exists; --overwrite replaces it, or name another output"
    with xr.open_dataset(path) as ds:
        assert ds.title == "Sodium over Harrow"
    save_product(make_product(title="second"), path, overwrite=True)
    with xr.open_dataset(path) as ds:
        assert ds.title == "second"


def test_a_file_is_complete_only_after_all_else_is_on_the_disk(product, tmp_path, monkeypatch):
    save_product(product, tmp_path / "harrow.nc")
    seen = []

    def look(_):
        for part in tmp_path.glob(".*.part"):
            with netCDF4.Dataset(part) as file:
                seen.append("complete" in file.ncattrs())

    with open_product(tmp_path / "harrow.nc") as ds:
        monkeypatch.setattr(os, "fsync", look)
        save_product(ds, tmp_path / "copy.nc")
    assert seen == [False, True]


def test_packing_left_on_a_variable_cannot_round_its_numbers(product, tmp_path):
    product.number_density.encoding.update(dtype="int16", scale_factor=0.1, chunksizes=(1, 1, 1, 1))
    save_product(product, tmp_path / "harrow.nc")
    with open_product(tmp_path / "harrow.nc") as ds:
        assert data_checksum(ds) == data_checksum(product)


def test_a_product_overwrites_the_file_it_was_opened_from(product, tmp_path):
    path = tmp_path / "harrow.nc"
    save_product(product, path)
    with open_product(path) as ds:
        checksum = ds.data_checksum
        save_product(ds, path, overwrite=True)
    with open_product(path) as ds:
        assert ds.data_checksum == checksum


def test_a_missing_folder_is_refused(product, tmp_path):
    path = tmp_path / "nowhere" / "harrow.nc"
    with pytest.raises(InputError) as refusal:
        save_product(product, path)
    assert str(refusal.value) == f"{path}: there is no folder {path.parent}"


def test_a_read_only_folder_is_refused(product, tmp_path, monkeypatch):
    monkeypatch.setattr(os, "access", lambda *_: False)
    with pytest.raises(InputError) as refusal:
        save_product(product, tmp_path / "harrow.nc")
    assert str(refusal.value) == f"{tmp_path / 'harrow.nc'}: cannot write in {tmp_path}: Permission denied"


def test_a_folder_is_never_overwritten(tmp_path):
    with pytest.raises(InputError) as refusal:
        check_output(tmp_path, overwrite=True)
    assert str(refusal.value) == f"{tmp_path}: exists and is not a file"


def test_a_dataset_that_is_no_product_is_refused(tmp_path):
    with pytest.raises(InputError) as refusal:
        save_product(xr.Dataset({"x": 1.0}), tmp_path / "x.nc")
    reason = "the Dataset cannot be saved: is not a product of this program"
    assert str(refusal.value) == f"{tmp_path / 'x.nc'}: {reason}"
    assert list(tmp_path.iterdir()) == []


def _fail(number):
    def raise_it(*_, **__):
        raise OSError(number, os.strerror(number))

    return raise_it


def test_a_full_disk_is_one_message_and_leaves_no_half_file(product, tmp_path, monkeypatch):
    monkeypatch.setattr(os, "fsync", _fail(errno.ENOSPC))
    with pytest.raises(
        TracerError, match=r"harrow\.nc: cannot be written: is the disk full\? .* MB free, up to"
    ):
        save_product(product, tmp_path / "harrow.nc")
    assert list(tmp_path.iterdir()) == []


def test_bytes_are_written_whole_or_not_at_all(tmp_path, monkeypatch):
    path = tmp_path / "figure.png"
    save_bytes(b"first", path)
    with pytest.raises(InputError, match="exists; --overwrite replaces it"):
        save_bytes(b"second", path)
    monkeypatch.setattr(os, "fsync", _fail(errno.ENOSPC))
    with pytest.raises(TracerError, match=r"figure\.png: cannot be written: is the disk full\?"):
        save_bytes(b"second", path, overwrite=True)
    assert [(entry.name, entry.read_bytes()) for entry in tmp_path.iterdir()] == [("figure.png", b"first")]


def test_another_failure_does_not_speak_of_a_full_disk(product, tmp_path, monkeypatch):
    monkeypatch.setattr(os, "replace", _fail(errno.EACCES))
    with pytest.raises(TracerError) as failure:
        save_product(product, tmp_path / "harrow.nc")
    assert str(failure.value) == f"{tmp_path / 'harrow.nc'}: cannot be written: {os.strerror(errno.EACCES)}"
    assert list(tmp_path.iterdir()) == []


def test_an_interrupted_write_keeps_the_old_file_and_no_half_one(product, tmp_path, monkeypatch):
    def interrupt(*_, **__):
        raise KeyboardInterrupt

    path = tmp_path / "harrow.nc"
    save_product(product, path)
    before = path.read_bytes()
    monkeypatch.setattr(os, "replace", interrupt)
    with pytest.raises(KeyboardInterrupt):
        save_product(product, path, overwrite=True)
    assert [entry.name for entry in tmp_path.iterdir()] == ["harrow.nc"]
    assert path.read_bytes() == before


LIMITED = """
import resource, sys
from tracer.errors import TracerError
from tracer.product.checksum import data_checksum
from tracer.product.reading import open_product
from tracer.product.writing import save_product
ds = open_product(sys.argv[1]).load()
resource.setrlimit(resource.RLIMIT_FSIZE, (20_000, 20_000))
try:
    save_product(ds, sys.argv[2])
except TracerError as error:
    print(error)
"""


@pytest.mark.skipif(sys.platform == "win32", reason="Windows has no limit on the size of files")
def test_a_file_that_cannot_grow_is_one_message_and_leaves_no_half_file(product, tmp_path):
    (tmp_path / "out").mkdir()
    save_product(product, tmp_path / "harrow.nc")
    paths = [str(tmp_path / "harrow.nc"), str(tmp_path / "out" / "copy.nc")]
    done = subprocess.run([sys.executable, "-c", LIMITED, *paths], capture_output=True, text=True, check=True)
    assert done.stdout.startswith(f"{paths[1]}: cannot be written: is the disk full?")
    assert len(done.stdout.splitlines()) == 1
    assert done.stderr == ""
    assert list((tmp_path / "out").iterdir()) == []
