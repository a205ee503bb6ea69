"""Where a body stands on its orbit."""

import math

import numpy as np
import pytest

from tracer.catalogue.load import bodies, hosts
from tracer.catalogue.records import Orbit
from tracer.constants import ASTRONOMICAL_UNIT, GM_SUN
from tracer.physics.orbit import (
    hill_radius,
    mean_sunlight_distance,
    station_at_distance,
    station_at_true_anomaly,
)

ORBIT = bodies()["Mercury"].orbit
A, E = ORBIT.semi_major_axis, ORBIT.eccentricity


@pytest.mark.parametrize("true_anomaly", [0.0, 60.0, 123.0, 180.0, 300.0])
def test_station_obeys_energy_and_areas(true_anomaly):
    station = station_at_true_anomaly(ORBIT, true_anomaly)
    speed_squared = station.radial_velocity**2 + (station.distance * station.orbital_rate) ** 2
    assert speed_squared == pytest.approx(GM_SUN * (2.0 / station.distance - 1.0 / A), rel=1e-12)
    assert station.orbital_rate * station.distance**2 == pytest.approx(
        math.sqrt(GM_SUN * A * (1.0 - E * E)), rel=1e-12
    )


def test_outbound_recedes_and_inbound_comes_near():
    assert station_at_true_anomaly(ORBIT, 60.0).radial_velocity > 0.0
    assert station_at_true_anomaly(ORBIT, 300.0).radial_velocity < 0.0
    # Mercury's greatest radial velocity, GM_sun e / h, near 10 km/s.
    assert station_at_true_anomaly(ORBIT, 90.0).radial_velocity == pytest.approx(10.06e3, rel=1e-3)


def test_station_at_distance_turns_as_its_orbit_does():
    station = station_at_true_anomaly(ORBIT, 77.0)
    same = station_at_distance(ORBIT, station.distance, station.radial_velocity)
    assert same.orbital_rate == pytest.approx(station.orbital_rate, rel=1e-12)
    assert station_at_distance(ORBIT, A * (1.0 - E)).radial_velocity == 0.0


def test_station_without_orbit_turns_at_the_circular_rate():
    # A year at 1 au.
    period = 2.0 * math.pi / station_at_distance(None, ASTRONOMICAL_UNIT).orbital_rate
    assert period / 86400.0 == pytest.approx(365.2569, abs=1e-3)


@pytest.mark.parametrize("distance", [0.999 * A * (1 - E), 1.001 * A * (1 + E), 0.0, -1.0, math.nan])
def test_distance_off_the_orbit_is_refused(distance):
    with pytest.raises(ValueError, match="distance"):
        station_at_distance(ORBIT, distance)


def test_hill_radius_of_mercury():
    # Computed for this project from a (1 - e) (m/3M)^(1/3): 175,297 km.
    assert hill_radius(ORBIT, 2.2031868e13, hosts()["Sun"].gm) == pytest.approx(175297e3, rel=1e-4)


@pytest.mark.parametrize("eccentricity", [0.0, 0.2056, 0.8])
def test_mean_sunlight_is_that_over_a_turn(eccentricity):
    # The mean over time by quadrature over the eccentric anomaly E: dt ~ 1 - e cos E, d = a (1 - e cos E).
    nearness = 1.0 - eccentricity * np.cos(2.0 * np.pi * np.arange(4096) / 4096)
    mean = np.mean(nearness / nearness**2)
    assert mean_sunlight_distance(Orbit(7e10, eccentricity)) == pytest.approx(7e10 / np.sqrt(mean), rel=1e-12)
