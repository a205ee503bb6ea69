"""Maps from netCDF files: what is read, and what is refused with which words."""

from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr

from tracer.engine.maps import FLUX_MAP, PROBABILITY_MAP, TEMPERATURE_MAP, MapKind, read_map
from tracer.engine.runspec.load import parse_run
from tracer.errors import InputError
from tracer.kernels.surface_map import SurfaceMap
from tracer.product.writing import save_product

RUN = """
title = "Helium over Harrow"
body = { name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2" }
gas = { species = "He" }
surface = { sticking = 1.0 }
domain = { outer_radius = "5 radii" }
[[release]]
name = "ground"
rate = "1e20 s-1"
speed = { law = "maxwell-flux", temperature = "150 K" }
"""


def good_map() -> xr.Dataset:
    """Return a map of 6 x 8 cells, the third latitude from the south warmer at each next hour."""
    latitude = xr.DataArray(np.arange(-75.0, 90.0, 30.0), dims="latitude", attrs={"units": "degrees_north"})
    local_time = xr.DataArray(np.arange(1.5, 24.0, 3.0), dims="local_time", attrs={"units": "h"})
    values = 100.0 + latitude * 0.1 + 2.0 * local_time
    return xr.Dataset(
        {"ground": values.assign_attrs(units="K")}, coords={"latitude": latitude, "local_time": local_time}
    )


def read(
    folder: Path, ds: xr.Dataset, variable: str = "ground", kind: MapKind = TEMPERATURE_MAP
) -> SurfaceMap:
    ds.to_netcdf(folder / "map.nc")
    return read_map(parse_run(RUN, folder / "run.toml"), "surface.temperature", "map.nc", variable, kind)


def refusal(folder: Path, ds: xr.Dataset, variable: str = "ground", kind: MapKind = TEMPERATURE_MAP) -> str:
    """Return the message about a map, without the run file's path, on one line."""
    with pytest.raises(InputError) as caught:
        read(folder, ds, variable, kind)
    message = str(caught.value)
    assert message.startswith(f"{folder / 'run.toml'}: surface.temperature.variable: ")
    assert len(message.splitlines()) == 1
    return message.removeprefix(f"{folder / 'run.toml'}: surface.temperature.variable: ")


def test_a_good_map_is_read_as_it_stands(tmp_path):
    found, ds = read(tmp_path, good_map()), good_map()
    np.testing.assert_array_equal(found.latitudes, ds.latitude)
    np.testing.assert_array_equal(found.local_times, ds.local_time)
    np.testing.assert_array_equal(found.values, ds.ground)
    assert all(part.dtype == np.float64 and part.flags.c_contiguous for part in found)


def test_order_of_dimensions_direction_of_axes_and_unit_do_not_matter(tmp_path):
    expected, ds = read(tmp_path, good_map()), good_map()
    other = ds.isel(latitude=slice(None, None, -1), local_time=slice(None, None, -1)).transpose()
    other["ground"] = (1e3 * other.ground).assign_attrs(units="mK")
    (tmp_path / "map.nc").unlink()
    for mine, theirs in zip(read(tmp_path, other), expected, strict=True):
        np.testing.assert_allclose(mine, theirs, rtol=1e-14)


def test_numbers_packed_with_scale_and_offset_are_unpacked(tmp_path):
    ds = good_map()
    packing = {"dtype": "int16", "scale_factor": 0.01, "add_offset": 200.0, "_FillValue": -32768}
    ds.to_netcdf(tmp_path / "map.nc", encoding={"ground": packing})
    found = read_map(
        parse_run(RUN, tmp_path / "run.toml"), "surface.temperature", "map.nc", "ground", TEMPERATURE_MAP
    )
    np.testing.assert_allclose(found.values, ds.ground, atol=0.0051)


def test_uneven_latitudes_that_reach_the_poles_are_taken(tmp_path):
    ds = good_map().assign_coords(latitude=[-85.0, -75.0, -40.0, 20.0, 60.0, 80.0])
    np.testing.assert_array_equal(read(tmp_path, ds).latitudes, [-85.0, -75.0, -40.0, 20.0, 60.0, 80.0])


def test_a_grid_with_a_row_at_each_pole_is_taken(tmp_path):
    ds = good_map().assign_coords(latitude=np.linspace(-90.0, 90.0, 6))
    assert read(tmp_path, ds).latitudes[-1] == 90.0


def test_a_product_of_the_package_is_a_map(tmp_path, small_product):
    save_product(small_product, tmp_path / "product.nc")
    spec = parse_run(RUN, tmp_path / "run.toml")
    found = read_map(spec, "surface.temperature", "product.nc", "surface_temperature", TEMPERATURE_MAP)
    np.testing.assert_array_equal(found.values, small_product.surface_temperature)


@pytest.mark.parametrize(
    ("unit", "kind", "factor"),
    [
        ("kelvin", TEMPERATURE_MAP, 1.0),
        ("1", PROBABILITY_MAP, 1.0),
        ("", PROBABILITY_MAP, 1.0),
        ("%", PROBABILITY_MAP, 0.01),
        ("m-2 s-1", FLUX_MAP, 1.0),
        ("whatever", FLUX_MAP, 1.0),
    ],
)
def test_units(tmp_path, unit, kind, factor):
    ds = good_map()
    size = 1e-3 if kind is PROBABILITY_MAP else 1.0
    ds["ground"] = (size * ds.ground).assign_attrs(units=unit)
    np.testing.assert_allclose(read(tmp_path, ds, kind=kind).values, factor * ds.ground, rtol=1e-14)


def test_numbers_without_a_unit_are_pure(tmp_path):
    ds = good_map()
    ds["ground"] = ds.ground / 1000.0
    del ds["ground"].attrs["units"]
    np.testing.assert_array_equal(read(tmp_path, ds, kind=PROBABILITY_MAP).values, ds.ground)


@pytest.mark.parametrize("unit", ["degC", "celsius", "deg_C", "m", "J", "furlong"])
def test_wrong_unit_of_a_temperature(tmp_path, unit):
    ds = good_map()
    ds["ground"].attrs["units"] = unit
    assert refusal(tmp_path, ds) == f'"ground" of map.nc: is in "{unit}"; a temperature must be in K'


def test_temperature_without_a_unit(tmp_path):
    ds = good_map()
    del ds["ground"].attrs["units"]
    assert (
        refusal(tmp_path, ds)
        == '"ground" of map.nc: has no attribute units; a temperature must say that it is in K'
    )


def test_probability_with_a_unit(tmp_path):
    message = refusal(tmp_path, good_map(), kind=PROBABILITY_MAP)
    assert message == '"ground" of map.nc: is in "K"; a probability must be a pure number'


def test_missing_variable(tmp_path):
    assert (
        refusal(tmp_path, good_map(), "grond")
        == '"grond" of map.nc: is not in the file; did you mean ground?'
    )
    assert refusal(tmp_path, good_map(), "t") == '"t" of map.nc: is not in the file; it holds ground'


def test_wrong_dimensions(tmp_path):
    ds = good_map()
    extra = ds.expand_dims(release=2)
    assert refusal(tmp_path, extra) == (
        '"ground" of map.nc: lies over (release, latitude, local_time); must lie over (latitude, local_time)'
    )
    renamed = ds.rename(local_time="longitude")
    assert refusal(tmp_path, renamed) == (
        '"ground" of map.nc: lies over (latitude, longitude); must lie over (latitude, local_time)'
    )
    assert "lies over (latitude); must" in refusal(tmp_path, ds.isel(local_time=0))


def test_missing_coordinate_and_its_wrong_unit(tmp_path):
    message = refusal(tmp_path, good_map().drop_vars("local_time"))
    assert message == (
        '"ground" of map.nc: needs the coordinate local_time(local_time), the middles of its cells [h]'
    )
    ds = good_map()
    ds["local_time"].attrs["units"] = "degrees_east"
    assert refusal(tmp_path, ds) == '"ground" of map.nc: local_time is in "degrees_east"; must be in h'


@pytest.mark.parametrize(
    ("name", "values", "message"),
    [
        ("latitude", [-75.0, -45, -15, 15, 45, 95], "latitude[5] is 95; must be from -90 deg to 90 deg"),
        ("latitude", [-75.0, -45, -15, 15, 45, np.nan], "latitude[5] is nan; must be from -90 deg to 90 deg"),
        (
            "latitude",
            [-75.0, -45, -15, -20, 45, 75],
            "latitude goes from -15 to -20 at entry 3; must rise or fall all along",
        ),
        (
            "latitude",
            [-75.0, -45, -15, -15, 45, 75],
            "latitude goes from -15 to -15 at entry 3; must rise or fall all along",
        ),
        (
            "latitude",
            [-75.0, -45, -15, 15, 45, 65],
            "does not cover the sphere: the cell at latitude 65 deg ends at 75 deg; cells must reach 90 deg",
        ),
        (
            "latitude",
            [-50.0, -40, -15, 15, 45, 75],
            "does not cover the sphere: the cell at latitude -50 deg ends at -55 deg; cells must reach -90 deg",
        ),
        (
            "local_time",
            [1.5, 4.5, 7.5, 10.5, 13.5, 16.5, 19.5, 25.5],
            "local_time[7] is 25.5; must be from 0 h to 24 h",
        ),
        (
            "local_time",
            [0.0, 3.0, 7.5, 10.5, 13.5, 16.5, 19.5, 24.0],
            "has local times 0 and 24 h, which are one; leave out one of them",
        ),
        (
            "local_time",
            np.arange(8.0),
            "does not cover the sphere: from local time 7 h round to 0 h are 17 h, more than a cell of 1 h; cells must "
            "cover 24 h",
        ),
    ],
)
def test_axes_that_do_not_cover_the_sphere(tmp_path, name, values, message):
    ds = good_map().assign_coords({name: np.asarray(values, dtype=float)})
    assert refusal(tmp_path, ds) == f'"ground" of map.nc: {message}'


@pytest.mark.parametrize(
    ("value", "kind", "message"),
    [
        (
            np.nan,
            TEMPERATURE_MAP,
            "a hole at latitude -15 deg, local time 4.5 h; a temperature must be above 0 K",
        ),
        (0.0, TEMPERATURE_MAP, "0 K at latitude -15 deg, local time 4.5 h; a temperature must be above 0 K"),
        (
            -3.0,
            TEMPERATURE_MAP,
            "-3 K at latitude -15 deg, local time 4.5 h; a temperature must be above 0 K",
        ),
        (
            np.inf,
            TEMPERATURE_MAP,
            "a hole at latitude -15 deg, local time 4.5 h; a temperature must be above 0 K",
        ),
        (2.0, PROBABILITY_MAP, "2 at latitude -15 deg, local time 4.5 h; a probability must be from 0 to 1"),
        (-1.0, FLUX_MAP, "-1 at latitude -15 deg, local time 4.5 h; a relative flux must be at least 0"),
    ],
)
def test_values_that_are_impossible(tmp_path, value, kind, message):
    ds = good_map()
    if kind is PROBABILITY_MAP:
        ds["ground"] = (ds.ground / 1000.0).assign_attrs(units="1")
    ds["ground"][2, 1] = value
    assert refusal(tmp_path, ds, kind=kind) == f'"ground" of map.nc: {message}'


def test_further_bad_cells_are_counted(tmp_path):
    ds = good_map()
    ds["ground"][2, 1:4] = np.nan
    assert "local time 4.5 h (and 2 more cells); a temp" in refusal(tmp_path, ds)


def test_files_that_cannot_be_read(tmp_path):
    spec = parse_run(RUN, tmp_path / "run.toml")

    def message(file: str) -> str:
        with pytest.raises(InputError) as caught:
            read_map(spec, "surface.temperature", file, "ground", TEMPERATURE_MAP)
        assert len(str(caught.value).splitlines()) == 1
        return str(caught.value).removeprefix(f"{tmp_path / 'run.toml'}: surface.temperature.file: ")

    assert message("absent.nc") == f'"absent.nc" no such file in {tmp_path}'
    assert message(".") == '"." is a folder; must be a netCDF file'
    (tmp_path / "text.nc").write_text("latitude,local_time\n", encoding="utf-8")
    assert message("text.nc").startswith('"text.nc" cannot be read as netCDF: ')
    good_map().to_netcdf(tmp_path / "whole.nc")
    whole = (tmp_path / "whole.nc").read_bytes()
    (tmp_path / "cut.nc").write_bytes(whole[: len(whole) // 3])
    assert message("cut.nc").startswith('"cut.nc" cannot be read as netCDF: ')


def test_lists_of_uneven_length_are_no_map(tmp_path):
    good_map().to_netcdf(tmp_path / "map.nc")
    with netCDF4.Dataset(tmp_path / "map.nc", "a") as file:
        lists = file.createVLType(np.float64, "list")
        variable = file.createVariable("lists", lists, ("latitude", "local_time"))
        variable[0, 0] = np.ones(3)
    spec = parse_run(RUN, tmp_path / "run.toml")
    with pytest.raises(InputError) as caught:
        read_map(spec, "surface.temperature", "map.nc", "lists", FLUX_MAP)
    assert len(str(caught.value).splitlines()) == 1


def test_text_is_no_map(tmp_path):
    ds = good_map()
    ds["ground"] = ds.ground.astype(str)
    assert refusal(tmp_path, ds) == '"ground" of map.nc: ground does not hold numbers'
