"""The command line in sunlight: what `check`, `flight`, `run` and `summary` say of it."""

import csv
import json
from pathlib import Path

import numpy as np
import pytest

import tracer
from tracer.__main__ import main

RUN_FILE = """
title = "Command line in sunlight"
body = { name = "Mercury" }
gas = { species = "Na" }
sun = { true_anomaly = "59 deg" }
surface = { sticking = 1.0 }
domain = { outer_radius = "10 radii" }
grid = { altitude = { cells = 4 }, latitude_cells = 3, local_time_cells = 6 }
ensemble = { particles_per_batch = 50, batches = 3 }
[[release]]
name = "vent"
rate = "1e20 s-1"
speed = { law = "maxwell-flux", temperature = "2000 K" }
[[image]]
name = "north"
look_from = "north"
horizontal = ["-3 radii", "3 radii"]
vertical = ["-3 radii", "3 radii"]
pixels = [6, 6]
"""
RADIUS = 2439.4e3
AU = 1.495978707e11


@pytest.fixture(autouse=True)
def folder(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("sodium.toml").write_text(RUN_FILE, encoding="utf-8")
    return tmp_path


def exit_code(*words: str) -> int:
    with pytest.raises(SystemExit) as ended:
        main(words)
    return ended.value.code or 0


def checked(capsys, *changes: str):
    settings = [word for change in changes for word in ("--set", change)]
    assert exit_code("check", "sodium.toml", "--json", *settings) == 0
    return json.loads(capsys.readouterr().out)


def test_check_tells_machines_where_the_body_stands_and_what_light_does(capsys):
    sun = checked(capsys)
    assert sun["true_anomaly"] == 59.0
    # a (1 - e^2)/(1 + e cos f) with the catalogue's orbit of Mercury.
    distance = 0.387098 * AU * (1.0 - 0.20563**2) / (1.0 + 0.20563 * np.cos(np.radians(59.0)))
    assert sun["distance"] == pytest.approx(distance, rel=1e-9)
    assert sun["radial_velocity"] > 8000.0
    assert sun["orbital_rate"] > 0.0
    # Potter & Killen 2008, Icarus 194, 1: at most 54 % of surface gravity.
    assert sun["radiation_acceleration_over_gravity"] == pytest.approx(0.53, abs=0.01)
    assert sun["radiation_acceleration"] == pytest.approx(1.96, rel=0.02)
    assert sun["photo_lifetime"] == pytest.approx((distance / AU) ** 2 / 5.9e-6, rel=1e-6)
    assert (sun["lines"], sun["lines_without_g"]) == (["na_d2", "na_d1"], [])


def test_check_tells_people_the_same(capsys):
    assert exit_code("check", "sodium.toml", "--set", "gas.species=Mg") == 0
    rows = dict(
        row.strip().split("  ", 1) for row in capsys.readouterr().out.splitlines() if row.startswith("  ")
    )
    assert rows["true anomaly"].strip() == "59 deg"
    assert rows["distance from the Sun"].strip() == "0.335227 au"
    assert rows["lines with g"].strip() == "none"
    assert rows["lines without g"].strip() == "mg_2852"
    assert exit_code("check", "sodium.toml") == 0
    shown = capsys.readouterr().out
    assert "53 % of surface gravity" in shown
    assert "1.905e+04 s in full sunlight" in shown


def test_check_without_a_sun_says_so(capsys):
    Path("sodium.toml").write_text(
        RUN_FILE.replace('sun = { true_anomaly = "59 deg" }\n', ""), encoding="utf-8"
    )
    figures = checked(capsys)
    for name in ("true_anomaly", "distance", "radiation_acceleration", "photo_lifetime", "lines"):
        assert figures[name] is None
    assert exit_code("check", "sodium.toml") == 0
    assert "none: gravity alone" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("changes", "propagator"),
    [
        ([], "adaptive integration"),
        (["sun.tide=false", "gas.species=O2"], "closed-form Kepler arcs"),
        (["gas.species=O2"], "adaptive integration"),
        (["sun.tide=false", "gas.species=O2", "gas.photoionization_rate=1e-6 s-1"], "adaptive integration"),
        (["sun.tide=false", "gas.species=Na", "gas.radiation_acceleration=none"], "adaptive integration"),
    ],
)
def test_check_names_the_propagator(capsys, changes, propagator):
    assert checked(capsys, *changes)["propagator"].startswith(propagator)


def test_bad_place_of_the_body_ends_with_2_and_one_line(capsys):
    sun = 'sun={ distance = "1 au" }'
    assert exit_code("check", "sodium.toml", "--set", sun) == 2
    shown = capsys.readouterr()
    assert shown.out == ""
    assert shown.err.startswith('tracer: sodium.toml: sun.distance: "1 au" ')
    assert shown.err.count("\n") == 1


FLIGHT = {"--latitude": "0", "--local-time": "16.5", "--zenith-angle": "45", "--azimuth": "90"}


def flown(capsys, speed: str, *changes: str):
    """Return (summary, path by column) of a flight from the afternoon eastwards, over the terminator into the night."""
    words = [word for pair in FLIGHT.items() for word in pair]
    settings = [word for change in changes for word in ("--set", change)]
    assert (
        exit_code("flight", "sodium.toml", *words, "--speed", speed, "-o", "path.csv", "--json", *settings)
        == 0
    )
    with open("path.csv", newline="", encoding="utf-8") as file:
        header, *rows = csv.reader(file)
    assert header == ["time", "survival", "lit", "x", "y", "z", "vx", "vy", "vz"]
    return json.loads(capsys.readouterr().out), dict(zip(header, np.array(rows, dtype=float).T, strict=True))


def test_flight_over_the_terminator_is_lit_in_light_alone(capsys):
    _, path = flown(capsys, "2.5 km/s")
    x, rho = path["x"], np.hypot(path["y"], path["z"])
    # Behind the body the penumbra is as wide as twice the Sun's angular radius, 0.8 degrees here, times the distance.
    half_width = 0.02 * np.abs(x)
    light = (x > 0.01 * RADIUS) | ((x < 0.0) & (rho > RADIUS + half_width))
    umbra = (x < -0.05 * RADIUS) & (rho < RADIUS - half_width)
    assert np.count_nonzero(light) > 5
    assert np.count_nonzero(umbra) > 5
    assert np.all(path["lit"][light] == 1.0)
    assert np.all(path["lit"][umbra] == 0.0)
    assert np.all((path["lit"] >= 0.0) & (path["lit"] <= 1.0))


def test_survival_falls_in_light_and_stays_in_the_dark(capsys):
    _, path = flown(capsys, "2.5 km/s")
    lit, fall = path["lit"], -np.diff(path["survival"])
    both_lit = (lit[:-1] == 1.0) & (lit[1:] == 1.0)
    both_dark = (lit[:-1] == 0.0) & (lit[1:] == 0.0)
    assert np.count_nonzero(both_dark) > 5
    assert np.all(fall[both_lit] > 0.0)
    assert np.all(np.abs(fall[both_dark]) < 1e-15)
    # In light it falls as the photo-rate says: 5.9e-6 s-1 at 1 au, quiet Sun.
    rate = fall[both_lit] / np.diff(path["time"])[both_lit] / path["survival"][:-1][both_lit]
    np.testing.assert_allclose(rate, 5.9e-6 / 0.335227**2, rtol=0.01)


def test_without_shadow_survival_falls_all_the_way(capsys):
    _, path = flown(capsys, "2.5 km/s", "sun.shadow=none")
    assert np.all(path["lit"] == 1.0)
    assert np.all(np.diff(path["survival"]) < 0.0)


def test_last_row_of_a_flight_in_sunlight_is_its_end(capsys):
    summary, path = flown(capsys, "1.4 km/s")
    assert summary["fate"] == "landed"
    assert path["time"][-1] == summary["flight_time"]
    end = np.array([path[axis][-1] for axis in "xyz"])
    # Landing on the sphere to 1e-9 radii is promised.
    assert np.linalg.norm(end) == pytest.approx(RADIUS, rel=1e-9)
    assert summary["local_time"] == pytest.approx(
        (12.0 + np.degrees(np.arctan2(end[1], end[0])) / 15.0) % 24.0, rel=1e-9
    )
    assert (
        summary["apex_altitude"] >= np.hypot(np.hypot(path["x"], path["y"]), path["z"]).max() - RADIUS - 1e-3
    )
    assert np.all(np.diff(path["time"]) > 0.0)


def test_flight_that_crosses_the_outer_radius_ends_there(capsys):
    summary, path = flown(capsys, "6 km/s")
    assert summary["fate"] == "escaped"
    end = np.array([path[axis][-1] for axis in "xyz"])
    assert np.linalg.norm(end) == pytest.approx(10.0 * RADIUS, rel=1e-9)


def test_lit_is_told_on_closed_form_arcs_too(capsys):
    _, path = flown(capsys, "2.5 km/s", "sun.tide=false", "gas.species=O2")
    assert len(path["time"]) == 201
    assert path["lit"][0] == 1.0
    assert path["lit"].min() == 0.0
    assert np.all(path["survival"] == 1.0)


def test_run_in_sunlight_writes_lines_and_summary_lists_them(capsys):
    assert exit_code("run", "sodium.toml") == 0
    assert "ionised" in capsys.readouterr().out
    with tracer.open_product("sodium.nc") as ds:
        assert ds.line_name.values.tolist() == ["na_d2", "na_d1"]
        assert ds.brightness_north.dims == ("line", "release", "north_vertical", "north_horizontal")
        assert ds.brightness_north.attrs["units"] == "1e10 m-2 s-1"
        assert "rayleigh" in ds.brightness_north.attrs["long_name"]
        assert float(ds.emission_rate.sel(line="na_d2").sum()) > float(
            ds.emission_rate.sel(line="na_d1").sum()
        )
        assert ds.attrs["sun_distance"] == pytest.approx(0.335227 * AU, rel=1e-5)
        assert ds.attrs["share_beyond_line_tables"] == 0.0
    assert exit_code("summary", "sodium.nc", "--json") == 0
    figures = json.loads(capsys.readouterr().out)
    assert {"brightness_north", "emission_rate", "ionization_rate"} <= set(
        figures["median_relative_standard_error"]
    )
    assert figures["releases"]["vent"]["ledger"]["ionized"] > 0.0


def test_summary_says_what_the_numbers_of_a_moving_body_mean(capsys):
    changes = ['sun.motion="moving"', 'release[1].rate_scaling="inverse-square"', 'domain.age_limit="1 h"']
    settings = [word for change in changes for word in ("--set", change)]
    assert exit_code("run", "sodium.toml", *settings) == 0
    capsys.readouterr()
    assert exit_code("summary", "sodium.nc") == 0
    told = " ".join(capsys.readouterr().out.split())
    # The window is the limit of age where that is shorter than a degree of mean anomaly.
    assert "What happens in the last 1 h before the stated position." in told
    assert "vent, with the inverse square of the distance from the Sun." in told
    assert "what lies behind the limit is missing:" in told
    assert exit_code("summary", "sodium.nc", "--json") == 0
    figures = json.loads(capsys.readouterr().out)
    assert figures["motion"] == "moving"
    assert figures["event_window"] == pytest.approx(3600.0)
    assert 0.0 < figures["releases"]["vent"]["share_older_than_age_limit"] < 1.0


def test_summary_of_a_body_that_stands_still_tells_of_a_steady_state(capsys):
    assert exit_code("run", "sodium.toml") == 0
    capsys.readouterr()
    assert exit_code("summary", "sodium.nc") == 0
    told = " ".join(capsys.readouterr().out.split())
    assert "The steady state: every source has released at its rate" in told
    assert "stated position" not in told
    assert exit_code("summary", "sodium.nc", "--json") == 0
    figures = json.loads(capsys.readouterr().out)
    assert figures["motion"] == "stationary"
    assert "share_older_than_age_limit" not in figures["releases"]["vent"]
