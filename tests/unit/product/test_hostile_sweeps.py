"""Files that claim to be sweeps and are not are refused by their claims alone."""

import netCDF4
import numpy as np
import pytest

from tracer.errors import InputError
from tracer.product.reading import is_sweep, open_product, open_sweep
from tracer.product.sweeping import sweep_point

SIZES = {"sticking": 2, "release": 1, "fate": 6, "altitude": 2, "latitude": 2, "local_time": 3, "bounds": 2}
SWEPT = ("sticking",)


@pytest.fixture
def forged(tmp_path):
    """Return a function that forges a sweep, lets `spoil` loose on it, and returns its path."""

    def forge(spoil=lambda file: None):
        path = tmp_path / "forged.nc"
        with netCDF4.Dataset(path, "w") as file:
            for name, size in SIZES.items():
                file.createDimension(name, size)
            file.product_version = 1
            file.product_kind = "sweep"
            file.swept_dimensions = "sticking"
            file.complete = np.int32(1)
            for name, dimension in (("release_name", "release"), ("fate_name", "fate")):
                file.createVariable(name, str, (dimension,))
            file.createVariable("point_attributes", str, SWEPT)
            file.createVariable("ledger", "f8", (*SWEPT, "release", "fate"))
            spoil(file)
        return path

    return forge


def why_refused(path) -> str:
    with pytest.raises(InputError) as refusal:
        open_sweep(path)
    return str(refusal.value).removeprefix(f"{path}: ")


def test_forged_sweep_without_a_fault_opens_but_is_no_product_of_a_run(forged):
    path = forged()
    open_sweep(path).close()
    assert is_sweep(path)
    with pytest.raises(InputError, match="is the product of a sweep, not of a run"):
        open_product(path)


def test_a_sweep_of_another_kind_or_version_is_refused(forged):
    assert why_refused(forged(lambda file: file.setncattr("product_kind", "run"))) == (
        "is the product of a run, not of a sweep"
    )
    assert why_refused(forged(lambda file: file.setncattr("product_version", 2))) == (
        "is of product_version 2; this package reads version 1"
    )
    assert why_refused(forged(lambda file: file.setncattr("swept_dimensions", ""))) == (
        "is damaged: it does not say what was swept"
    )
    assert why_refused(forged(lambda file: file.setncattr("complete", np.int32(0)))) == (
        "is incomplete: writing it was not finished"
    )


def test_variables_without_the_swept_dimensions_are_refused(forged):
    def spoil(file):
        file.createVariable("mean_life", "f8", ("release",))

    assert why_refused(forged(spoil)) == "has mean_life over release; it must be over sticking, release"
    assert why_refused(forged(lambda file: file.setncattr("swept_dimensions", "release"))) == (
        "has ledger over sticking, release, fate; it must be over release, release, fate"
    )


def test_text_where_numbers_belong_is_refused(forged):
    def spoil(file):
        file.createVariable("cell_area", str, ("latitude",))

    assert why_refused(forged(spoil)) == "has text in cell_area"


@pytest.mark.parametrize("text", ["", "[1, 2]", "{", "[" * 100_000])
def test_damaged_words_about_a_point_are_refused(forged, text):
    def spoil(file):
        file.variables["point_attributes"][:] = np.array([text, text], dtype=object)

    with (
        open_sweep(forged(spoil)) as ds,
        pytest.raises(InputError, match="what the sweep says of point 2 is damaged"),
    ):
        sweep_point(ds, 2)


@pytest.mark.parametrize("number", [0, 3, -1])
def test_points_that_there_are_not_are_refused(forged, number):
    with (
        open_sweep(forged()) as ds,
        pytest.raises(InputError, match=f"there is no point {number}; there are 2"),
    ):
        sweep_point(ds, number)
