"""Files that claim what no product has are refused by their claims alone, without being read."""

import time

import netCDF4
import numpy as np
import pytest

from tracer.errors import InputError
from tracer.product.reading import open_product
from tracer.product.writing import save_product

SIZES = {"release": 1, "fate": 6, "altitude": 2, "latitude": 2, "local_time": 3, "bounds": 2}


@pytest.fixture
def forged(tmp_path):
    """Return a function that forges a product, lets `spoil` loose on it, and says why it is refused."""

    def forge(spoil=lambda file: None, **sizes) -> str:
        path = tmp_path / "forged.nc"
        with netCDF4.Dataset(path, "w") as file:
            for name, size in {**SIZES, **sizes}.items():
                file.createDimension(name, size)
            file.product_version = 1
            file.complete = np.int32(1)
            for name, dimension in (("release_name", "release"), ("fate_name", "fate")):
                file.createVariable(name, str, (dimension,))
            file.createVariable("ledger", "f8", ("release", "fate"), chunksizes=(1, 1))
            spoil(file)
        begin = time.monotonic()
        with pytest.raises(InputError) as refusal:
            open_product(path)
        # Terabytes are claimed: to read them would take hours.
        assert time.monotonic() - begin < 5.0
        return str(refusal.value).removeprefix(f"{path}: ")

    return forge


def variable(name, kind, dimensions):
    return lambda file: file.createVariable(name, kind, dimensions, chunksizes=(1,) * len(dimensions))


def test_huge_dimensions_are_refused(forged):
    reason = forged(altitude=10**12)
    assert reason == "has 1000000000000 positions along altitude; at most 65536 are allowed"


def test_more_data_than_the_file_can_hold_is_refused(forged):
    cells = ("release", "altitude", "latitude", "local_time")
    sizes = {"altitude": 4096, "latitude": 4096, "local_time": 4096}
    reason = forged(variable("number_density", "f8", cells), **sizes)
    assert reason.startswith("claims 5.5e+11 bytes of data in a file of ")


@pytest.mark.parametrize(
    ("name", "kind", "dimensions", "reason"),
    [
        (
            "number_density",
            "f8",
            ("release", "latitude"),
            "has number_density over release, latitude; it must be",
        ),
        ("mean_life", "i4", ("release",), "has whole numbers in mean_life"),
        ("mean_life", str, ("release",), "has text in mean_life"),
        ("mean_life", "S1", ("release",), "has no numbers in mean_life"),
        ("line_name", "f8", ("release",), "has no text in line_name"),
        ("a..b", "f8", ("release",), "has a variable named 'a..b'"),
        ("column_<x>", "f8", ("release",), "has a variable named 'column_<x>'"),
    ],
)
def test_wrong_shapes_types_and_names_are_refused(forged, name, kind, dimensions, reason):
    assert forged(variable(name, kind, dimensions)).startswith(reason)


def test_groups_and_paths_are_refused(forged):
    assert forged(lambda file: file.createGroup("etc")) == "holds groups or types that no product has"


@pytest.mark.parametrize(
    ("name", "value", "reason"),
    [
        ("batches", "twenty", "has no whole number in its attribute batches"),
        ("batches", np.arange(3), "has no whole number in its attribute batches"),
        ("wall_seconds", "1 s", "has no number in its attribute wall_seconds"),
        ("run_file", 5, "has no text in its attribute run_file"),
        ("run_file", "#" * 10_000_001, "has 10000001 characters in its attribute run_file"),
    ],
)
def test_false_words_are_refused(forged, name, value, reason):
    assert forged(lambda file: file.setncattr(name, value)) == reason


def test_what_is_read_lazily_stays_in_its_file(make_product, tmp_path):
    save_product(make_product(), tmp_path / "harrow.nc")
    with open_product(tmp_path / "harrow.nc") as ds:
        assert not any(ds[name].variable._in_memory for name in ("number_density", "ledger"))
        ds.number_density.isel(altitude=0).load()
        assert not ds.number_density.variable._in_memory
