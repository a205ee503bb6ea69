"""The ground's laws and maps at the command line: figures of `check`, refusals of all commands."""

import json
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from tracer.__main__ import main

RUN_FILE = """
title = "Ground by a map"
body = { name = "Ball", radius = "1000 km", gm = "3000 km3 s-2" }
gas = { species = "He" }
domain = { outer_radius = "5 radii" }
grid = { altitude = { cells = 4 }, latitude_cells = 3, local_time_cells = 6 }
ensemble = { particles_per_batch = 50, batches = 2 }
[surface]
temperature = { law = "map", file = "ground.nc", variable = "warmth" }
sticking = { law = "exponential", at = "250 K", value = 0.5, e_folding = "272.8 K" }
[[release]]
name = "vent"
rate = "1e20 s-1"
speed = { law = "maxwell-flux", temperature = "surface" }
place = { law = "map", file = "flux.nc", variable = "flux" }
"""


def surface_map(name: str, unit: str) -> xr.Dataset:
    latitude, local_time = np.arange(-60.0, 90.0, 60.0), np.arange(2.0, 24.0, 4.0)
    values = 200.0 + 10.0 * np.arange(18.0).reshape(3, 6)
    return xr.Dataset(
        {name: (("latitude", "local_time"), values, {"units": unit})},
        coords={"latitude": latitude, "local_time": local_time},
    )


@pytest.fixture(autouse=True)
def folder(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("ground.toml").write_text(RUN_FILE, encoding="utf-8")
    surface_map("warmth", "K").to_netcdf("ground.nc")
    surface_map("flux", "m-2 s-1").to_netcdf("flux.nc")
    return tmp_path


def exit_code(*words: str) -> int:
    with pytest.raises(SystemExit) as ended:
        main(words)
    return ended.value.code or 0


def test_check_gives_people_and_machines_the_range_of_the_ground(capsys):
    assert exit_code("check", "ground.toml", "--json") == 0
    figures = json.loads(capsys.readouterr().out)
    assert figures["temperature_law"] == "map"
    assert (figures["lowest_temperature"], figures["highest_temperature"]) == (200.0, 370.0)
    assert figures["lowest_sticking"] == pytest.approx(0.5 * np.exp(-120.0 / 272.8), rel=1e-12)
    assert figures["highest_sticking"] == pytest.approx(0.5 * np.exp(50.0 / 272.8), rel=1e-12)
    assert figures["solar_day"] is None
    assert exit_code("check", "ground.toml") == 0
    out = capsys.readouterr().out
    assert "200 to 370 K anywhere" in out
    assert "0.3221 on the warmest to 0.6006 on the coldest ground" in out


@pytest.mark.parametrize("command", [("check",), ("run",)])
@pytest.mark.parametrize(
    ("spoil", "message"),
    [
        (
            lambda ds: ds.assign(warmth=ds.warmth.assign_attrs(units="degC")),
            'ground.toml: surface.temperature.variable: "warmth" of ground.nc: is in "degC"; a temperature '
            "must be in K",
        ),
        (
            lambda ds: ds.assign(warmth=ds.warmth.where(ds.warmth != 250.0).assign_attrs(units="K")),
            'ground.toml: surface.temperature.variable: "warmth" of ground.nc: a hole at latitude -60 deg, local time '
            "22 h; a temperature must be above 0 K",
        ),
        (
            lambda ds: ds.isel(latitude=slice(0, 2)),
            'ground.toml: surface.temperature.variable: "warmth" of ground.nc: does not cover the sphere: the cell at '
            "latitude 0 deg ends at 30 deg; cells must reach 90 deg",
        ),
    ],
    ids=["unit", "hole", "coverage"],
)
def test_bad_maps_end_every_command_with_one_line_and_no_product(command, spoil, message, capsys):
    ds = spoil(surface_map("warmth", "K"))
    Path("ground.nc").unlink()
    ds.to_netcdf("ground.nc")
    assert exit_code(*command, "ground.toml") == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err.strip().endswith(message)
    assert not Path("product.nc").exists()
    assert sorted(path.name for path in Path().iterdir() if path.suffix == ".nc") == ["flux.nc", "ground.nc"]


def test_a_run_never_writes_over_its_maps(capsys):
    for name in ("ground.nc", "flux.nc"):
        before = Path(name).read_bytes()
        assert exit_code("run", "ground.toml", "-o", name, "--overwrite") == 2
        assert Path(name).read_bytes() == before
