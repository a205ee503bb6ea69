"""Atoms that the ground holds for a while, and places that keep them, in whole runs."""

import json
from math import exp

import netCDF4
import numpy as np
import pytest

import tracer
from tracer.__main__ import main
from tracer.constants import AVOGADRO, BOLTZMANN
from tracer.engine.runspec.load import parse_run
from tracer.engine.tracing import run
from tracer.errors import InputError

RATE = 1e24
HAZARD = 2e-5
RUN = """
title = "Argon over Harrow, small"
body = { name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2", rotation_period = "4 d" }
gas = { species = "Ar", loss = [{ name = "loss", rate = "2e-5 s-1" }] }
domain = { outer_radius = "3 radii", age_limit = "1 yr" }
grid = { altitude = { first_cell = "50 km", top = "2 radii", cells = 4 }, latitude_cells = 4, local_time_cells = 12 }
ensemble = { particles_per_batch = 100, batches = 20 }
[[release]]
name = "interior"
rate = "1e24 s-1"
speed = { law = "maxwell-flux", temperature = "surface" }
[surface]
temperature = { law = "quarter-power", subsolar = "350 K", night = "100 K" }
sticking = 0.8
adsorbed = "desorbed"
desorption = { energy = "28 kJ/mol", attempt_frequency = "1e13 s-1" }
"""
WARM = RUN.replace(
    '{ law = "quarter-power", subsolar = "350 K", night = "100 K" }', '{ law = "uniform", value = "105 K" }'
)


def total(product, name: str) -> float:
    """Return the integral over the ground of a quantity per area."""
    return float((product[name] * product.cell_area).sum())


def test_atoms_aloft_and_at_rest_make_up_the_mean_life(traced):
    product = traced(RUN).isel(release=0)
    aloft = float((product.number_density * product.cell_volume).sum())
    at_rest = total(product, "adsorbed_column")
    life = RATE * product.mean_life.item()
    # Nothing leaves 3 radii: the grid holds all. Time at rest is counted whole, time aloft by samples, a percent of it.
    assert 0.1 * life < at_rest < 0.9 * life
    assert aloft == pytest.approx(life - at_rest, rel=0.01)


def test_nothing_is_lost_while_at_rest(traced):
    product = traced(RUN).isel(release=0)
    aloft = RATE * product.mean_life.item() - total(product, "adsorbed_column")
    assert product.ledger.sel(fate="other_loss").item() == pytest.approx(HAZARD * aloft, rel=1e-9)
    closed = product.ledger.sum().item() - product.roulette_balance.item()
    assert closed == pytest.approx(RATE, rel=1e-9)
    assert total(product, "capture_flux") == 0.0


def test_column_at_rest_is_flux_times_residence_time(traced):
    product = traced(WARM).isel(release=0)
    # 28 kJ/mol of argon (Kegerreis et al. 2017), frequency 1e13 s-1, at 105 K; four of five landings stick.
    residence = exp(28e3 / AVOGADRO / (BOLTZMANN * 105.0)) * 1e-13
    expected = 0.8 * total(product, "return_flux") * residence
    # Each stay scatters as much as it lasts; weights from 1 down to 0.1 are worth half their number.
    error = expected / np.sqrt(0.5 * 0.8 * product.attrs["flights"])
    assert abs(total(product, "adsorbed_column") - expected) < 4.0 * error < 0.02 * expected


def test_night_holds_what_the_morning_lets_go(traced):
    at_rest = traced(RUN).isel(release=0).adsorbed_column.sum("latitude")
    # Cells of two hours: the last of the night beside the first of the day, and dusk beside the afternoon.
    assert at_rest.sel(local_time=5.0).item() > 100.0 * at_rest.sel(local_time=7.0).item() > 0.0
    assert at_rest.sel(local_time=19.0).item() > 10.0 * at_rest.sel(local_time=15.0).item()


def test_age_limit_ends_atoms_at_rest():
    spec = parse_run(
        RUN.replace('energy = "28 kJ/mol"', 'energy = "2 eV"'), "harrow.toml", ["domain.age_limit=5 d"]
    )
    product = run(spec, workers=1).isel(release=0)
    assert product.ledger.sel(fate="age_limit").item() > 0.5 * RATE
    aged = product.ledger.sel(fate="age_limit").item() * 5.0 * 86400.0
    # Those that reach the limit have lived just as long; the others died aloft within the first flights.
    assert RATE * product.mean_life.item() == pytest.approx(aged, rel=0.05)


def test_product_of_ground_that_keeps_has_no_column_at_rest(small_product):
    assert "adsorbed_column" not in small_product
    assert "roulette_balance_standard_error" in small_product


def test_all_that_lands_poleward_is_captured(traced):
    text = RUN.replace('adsorbed = "desorbed"', 'cold_traps = { poleward_of = "45 deg" }')
    text = text[: text.index("desorption =")].replace("sticking = 0.8", "sticking = 0")
    product = traced(text).isel(release=0)
    polar = abs(product.latitude) > 45.0
    kept, came = product.capture_flux, product.return_flux
    np.testing.assert_array_equal(kept.where(polar, drop=True), came.where(polar, drop=True))
    assert float(kept.where(~polar).sum()) == 0.0
    assert product.ledger.sel(fate="captured").item() == pytest.approx(
        total(product, "capture_flux"), rel=1e-12
    )


def write_traps(path, values: np.ndarray) -> None:
    """Write a map of probabilities (3, 4): three bands of 60 deg, four quarters of the day."""
    with netCDF4.Dataset(path, "w") as file:
        for name, middles in (("latitude", [-60.0, 0.0, 60.0]), ("local_time", [3.0, 9.0, 15.0, 21.0])):
            file.createDimension(name, len(middles))
            file.createVariable(name, "f8", (name,))[:] = middles
        file.createVariable("probability", "f8", ("latitude", "local_time"))[:] = values


def test_map_of_traps_is_the_share_of_landings_that_stays(tmp_path):
    values = np.zeros((3, 4))
    values[1, 1], values[2, 3], values[0, 0] = 0.3, 0.05, 1.0
    write_traps(tmp_path / "traps.nc", values)
    text = RUN[: RUN.index("sticking")] + 'cold_traps = { file = "traps.nc", variable = "probability" }\n'
    (tmp_path / "harrow.toml").write_text(
        text.replace("latitude_cells = 4", "latitude_cells = 6"), encoding="utf-8"
    )
    product = tracer.run(tracer.load_run(tmp_path / "harrow.toml"), workers=1).isel(release=0)
    area = product.cell_area
    for i, south in enumerate((-90.0, -30.0, 30.0)):
        for j, dawn in enumerate((0.0, 6.0, 12.0, 18.0)):
            cells = {"latitude": slice(south, south + 60.0), "local_time": slice(dawn, dawn + 6.0)}
            came = float((product.return_flux * area).sel(cells).sum())
            kept = float((product.capture_flux * area).sel(cells).sum())
            chance = values[i, j]
            # Binomial over the landings, of 2,000 atoms; survival weights below 1 make it cautious.
            landings = 2000.0 * came / RATE
            assert abs(kept / came - chance) <= 4.0 * np.sqrt(chance * (1.0 - chance) / landings)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (2.0, r"2 at latitude -60 deg, local time 3 h; a probability must be from 0 to 1"),
        (-0.1, r"-0\.1 at latitude -60 deg, local time 3 h; a probability must be from 0 to 1"),
        (np.nan, r"a hole at latitude -60 deg"),
    ],
)
def test_impossible_chances_are_refused(tmp_path, change, message):
    values = np.zeros((3, 4))
    values[0, 0] = change
    write_traps(tmp_path / "traps.nc", values)
    text = RUN[: RUN.index("sticking")] + 'cold_traps = { file = "traps.nc", variable = "probability" }\n'
    (tmp_path / "harrow.toml").write_text(text, encoding="utf-8")
    with pytest.raises(InputError, match=rf"surface\.cold_traps\.variable: .*{message}"):
        tracer.run(tracer.load_run(tmp_path / "harrow.toml"), workers=1)


def test_check_shows_how_long_the_ground_holds(tmp_path, capsys):
    path = tmp_path / "harrow.toml"
    path.write_text(RUN, encoding="utf-8")
    with pytest.raises(SystemExit) as ended:
        main(["check", str(path), "--json"])
    assert ended.value.code in (0, None)
    found = {one["place"]: one for one in json.loads(capsys.readouterr().out)["residence"]}
    assert list(found) == ["noon", "dusk", "midnight", "dawn"]
    # 28 kJ/mol at 100 K, frequency 1e13 s-1: 42.21 s (own evaluation of Frenkel's law).
    assert found["midnight"]["residence_time"] == pytest.approx(42.21, rel=2e-4)
    assert found["noon"]["temperature"] == 350.0
    with pytest.raises(SystemExit):
        main(["check", str(path)])
    shown = capsys.readouterr().out
    assert "residence at midnight" in shown
    assert "42.22 s at 100 K" in shown or "42.21 s at 100 K" in shown
