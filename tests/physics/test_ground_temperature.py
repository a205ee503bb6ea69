"""The ground's temperature in whole products, where heat is conducted: balance over a turn, slow and fast rotators."""

import numpy as np
import pytest

STEFAN_BOLTZMANN = 5.670374419e-8
"""sigma [W m-2 K-4], SI 2019."""

RUN = """
title = "Ground of a ball that turns once in {rotation}"
body = {{ name = "Ball", radius = "500 km", gm = "30 km3 s-2", rotation_period = "{rotation}" }}
sun = {{ distance = "1 au", tide = false }}
gas = {{ species = "unlit", mass = "40 u" }}
surface = {{ sticking = 1.0, temperature = {law} }}
domain = {{ outer_radius = "5 radii", age_limit = "1 d" }}
grid = {{ altitude = {{ cells = 2, top = "1 radii" }}, latitude_cells = 18, local_time_cells = 240 }}
ensemble = {{ particles_per_batch = 10, batches = 2 }}
[[release]]
name = "ground"
rate = "1e20 s-1"
speed = {{ law = "maxwell-flux", temperature = "surface" }}
"""
CONDUCTION = '{ law = "conduction", thermal_inertia = "50 J m-2 K-1 s-1/2", albedo = 0.1, emissivity = 0.9 }'
EQUILIBRIUM = '{ law = "equilibrium", albedo = 0.1, emissivity = 0.9, night = "1 K" }'


@pytest.fixture(scope="module")
def ground(traced):
    """Return a function from a rotation period and a law to the product's surface temperatures."""

    def temperatures(rotation: str, law: str = CONDUCTION):
        return traced(RUN.format(rotation=rotation, law=law)).surface_temperature

    return temperatures


@pytest.mark.parametrize("rotation", ["10 h", "30 d", "-30 d"])
def test_ground_radiates_in_a_turn_what_it_absorbs(ground, rotation):
    found = ground(rotation)
    radiated = 0.9 * STEFAN_BOLTZMANN * (found**4).mean("local_time")
    absorbed = 0.9 * 1361.0 * np.cos(np.radians(found.latitude)) / np.pi
    # The straight line between the map's latitudes, 1 deg apart, lies 0.4 % low in T^4 at 85 deg, 0.05 % at 75 deg.
    np.testing.assert_allclose(radiated, absorbed, rtol=5e-3)
    inner = slice(-75.0, 75.0)
    np.testing.assert_allclose(radiated.sel(latitude=inner), absorbed.sel(latitude=inner), rtol=1e-3)


def test_slow_rotator_is_in_equilibrium_by_day(ground):
    # A turn in 300,000 years: the Sun takes a year for one, backwards.
    found, balance = (
        ground("1e8 d", CONDUCTION.replace('"50 J', '"0.05 J')),
        ground("1e8 d", EQUILIBRIUM),
    )
    day = found.sel(local_time=slice(7.5, 16.5), latitude=slice(-60.0, 60.0))
    np.testing.assert_allclose(day, balance.sel(local_time=day.local_time, latitude=day.latitude), rtol=2e-3)
    assert float(found.sel(local_time=0.05, latitude=5.0, method="nearest")) < 40.0


def test_fast_rotator_has_the_temperature_of_the_days_mean(ground):
    found = ground("1 min", CONDUCTION.replace('"50 J', '"50000 J'))
    absorbed = 0.9 * 1361.0 * np.cos(np.radians(found.latitude)) / np.pi
    expected = (absorbed / (0.9 * STEFAN_BOLTZMANN)) ** 0.25
    np.testing.assert_allclose(found, expected.broadcast_like(found), rtol=5e-3)
    # Where the ground holds less heat the day shows.
    assert float(np.ptp(ground("10 h").sel(latitude=5.0).values)) > 40.0


def test_afternoon_is_warmer_than_the_morning_and_the_other_way_round_on_a_retrograde_body(ground):
    forth, back = ground("30 d").sel(latitude=5.0), ground("-30 d").sel(latitude=5.0)
    dusk, dawn = {"local_time": 18.5, "method": "nearest"}, {"local_time": 5.5, "method": "nearest"}
    assert float(forth.sel(**dusk)) > float(forth.sel(**dawn)) + 20.0
    assert float(back.sel(**dusk)) < float(back.sel(**dawn)) - 20.0
