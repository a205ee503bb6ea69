"""Gas that bounces from trap to trap or away: small versions of the studies in `analysis/validation/`."""

from math import exp, hypot, sqrt
from pathlib import Path

import pytest

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.engine.runspec.load import load_run, parse_run
from tracer.engine.tracing import run

RUNS = Path(__file__).parents[2] / "runs"


# Isothermal ground, uniform release, loss of 1e5 s in flight, traps poleward of a latitude: own independent Monte
# Carlo, standard error 0.0015.
@pytest.mark.parametrize(
    ("kelvin", "latitude", "share", "hops"),
    [
        ("250 K", "85 deg", 0.2314, 121.0),
        ("250 K", "80 deg", 0.3981, 95.4),
        ("392 K", "85 deg", 0.2311, 84.7),
    ],
)
def test_water_reaches_the_cold_traps_of_the_moon(kelvin, latitude, share, hops):
    settings = (
        "ensemble.particles_per_batch=300",
        f"surface.temperature.value={kelvin}",
        f"surface.cold_traps.poleward_of={latitude}",
    )
    product = run(load_run(RUNS / "moon-water-traps.toml", settings), workers=1).isel(release=0)
    # Binomial over 6,000 atoms, all caught at once or never; their weights differ little. False alarm 6e-5.
    error = hypot(sqrt(share * (1.0 - share) / 6000.0), 0.0015)
    assert abs(product.ledger.sel(fate="captured").item() / 1e24 - share) < 4.0 * error
    assert product.mean_flights.item() == pytest.approx(hops, rel=0.06)


def test_water_of_ceres_falls_into_traps_before_it_escapes():
    settings = (
        "ensemble.particles_per_batch=10_000",
        "body.rotation_period=1000 yr",
        "surface.sticking=0.013",
    )
    product = run(load_run(RUNS / "ceres-water.toml", settings), workers=1).isel(release=0)
    # A geometric series over landings with the escape fraction (1 + lambda) exp(-lambda); capture ten times as likely
    # as in Schorghofer et al. 2016, so that a small run sees enough of it.
    jeans = 62.628e9 * 18.015 * ATOMIC_MASS / (BOLTZMANN * 165.0 * 469.7e3)
    lands = 1.0 - (1.0 + jeans) * exp(-jeans)
    share = 0.013 * lands / (1.0 - (1.0 - 0.013) * lands)
    assert share == pytest.approx(0.0142, rel=0.02)
    error = sqrt(share / 200_000.0)
    assert abs(product.ledger.sel(fate="captured").item() / 1e26 - share) < 4.0 * error


def test_moon_keeps_hydrogen_for_a_day():
    text = """
    title = "Molecular hydrogen over the Moon"
    body = { name = "Moon" }
    gas = { species = "H2", mass = "2.01588 u" }
    domain = { outer_radius = "58100 km", age_limit = "10 yr" }
    grid = { altitude = { cells = 4 }, latitude_cells = 6, local_time_cells = 6 }
    ensemble = { particles_per_batch = 2000, batches = 10 }
    surface = { temperature = "hurley-2015" }
    [[release]]
    name = "uniform"
    rate = "1e24 s-1"
    speed = { law = "maxwell-flux", temperature = "surface" }
    """
    product = run(parse_run(text, "moon.toml"), workers=1).isel(release=0)
    # Own independent Monte Carlo, 5 %: temperatures of Hurley et al. 2015, lost beyond 58,100 km.
    assert product.mean_life.item() == pytest.approx(1.004e5, rel=0.05)
    assert product.mean_flights.item() == pytest.approx(9.4, rel=0.05)


def test_late_night_over_the_moon_is_empty_of_argon():
    settings = (
        "ensemble.particles_per_batch=3",
        "ensemble.batches=4",
        "surface.desorption.energy=0.32 eV",
        "grid.latitude_cells=6",
        "grid.local_time_cells=24",
        "domain.age_limit=1 yr",
    )
    product = run(load_run(RUNS / "moon-argon.toml", settings), workers=1).isel(release=0)
    ground = product.number_density.isel(altitude=0).sel(latitude=slice(-30.0, 30.0)).mean("latitude")
    # Observed: a peak at sunrise (Benna et al. 2015, GRL 42, 3723) and a night that empties before it.
    late = ground.sel(local_time=slice(2.0, 4.0)).mean().item()
    assert 0.0 < late < 0.05 * ground.sel(local_time=slice(6.0, 8.0)).max().item()
    assert 5.0 < ground.idxmax("local_time").item() < 8.0
