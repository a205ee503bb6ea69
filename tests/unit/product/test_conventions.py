"""The file against the CF conventions, by the checker that practitioners use; it needs no network."""

import netCDF4
import pytest

from tracer.engine.runspec.load import load_run
from tracer.engine.tracing import run
from tracer.product.writing import save_product


@pytest.fixture
def saved(product, tmp_path):
    save_product(product, tmp_path / "harrow.nc")
    return tmp_path / "harrow.nc"


def test_the_conventions_are_met(saved, check_conventions):
    done = check_conventions(saved)
    assert done.returncode == 0, done.stdout


def test_the_conventions_are_met_with_responses(small_light_run_file, tmp_path, check_conventions):
    product = run(
        load_run(small_light_run_file, ["ensemble.speed_bins=8", "ensemble.replicates=0"]), workers=1
    )
    save_product(product, tmp_path / "responses.nc")
    done = check_conventions(tmp_path / "responses.nc")
    assert done.returncode == 0, done.stdout


def test_the_only_advice_not_taken_is_the_order_of_axes(saved, check_conventions):
    # Local time is neither a longitude nor a time, so its place behind latitude looks foreign to the checker.
    done = check_conventions(saved, "strict")
    advice = [line for line in done.stdout.splitlines() if line.startswith("*")]
    assert all(
        "not in the recommended order T, Z, Y, X" in line and "local_time (U)" in line for line in advice
    )


def test_the_checker_fails_a_coordinate_without_its_unit(saved, check_conventions):
    with netCDF4.Dataset(saved, "a") as file:
        file["altitude"].delncattr("units")
    done = check_conventions(saved)
    assert done.returncode == 1
    assert "units" in done.stdout
