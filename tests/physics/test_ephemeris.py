"""Where bodies stand at a moment, against publications, astropy and two-body motion."""

from datetime import UTC, datetime

import numpy as np
import pytest
from astropy.coordinates import get_body_barycentric, solar_system_ephemeris
from astropy.time import Time
from scipy.optimize import brentq

from tracer.catalogue.load import bodies
from tracer.constants import ASTRONOMICAL_UNIT, GM_SUN
from tracer.physics.ephemeris import heliocentric_state, sighting
from tracer.physics.orbit import station_at_true_anomaly

MOMENTS = [
    datetime(1965, 3, 1, tzinfo=UTC),
    datetime(2001, 5, 26, 5, tzinfo=UTC),
    datetime(2031, 6, 10, tzinfo=UTC),
]


@pytest.mark.parametrize(
    ("moment", "published"),
    [
        # Leblanc & Johnson 2003, Icarus 164, 261 and Potter et al. 2002, Meteorit. Planet. Sci. 37, 1165, as
        # they give the true anomaly of two observations of Mercury's sodium; rounded there to a degree.
        (datetime(2001, 5, 26, tzinfo=UTC), 125.0),
        (datetime(2000, 6, 5, tzinfo=UTC), 114.0),
    ],
)
def test_mercury_stands_where_two_publications_have_it(moment, published):
    assert sighting("Mercury", moment).true_anomaly == pytest.approx(published, abs=0.5)


@pytest.mark.parametrize("moment", MOMENTS)
def test_mercury_follows_an_independent_two_body_orbit(moment):
    # Mean elements of Standish & Williams, Approximate Positions of the Planets (table 1, 1800-2050; from memory),
    # Kepler's equation solved by bracketing.
    days = (moment - datetime(2000, 1, 1, 12, tzinfo=UTC)).total_seconds() / 86400.0
    centuries = days / 36525.0
    a, e = 0.38709927 * ASTRONOMICAL_UNIT, 0.20563593 + 0.00001906 * centuries
    longitude = 252.25032350 + 149472.67411175 * centuries
    perihelion = 77.45779628 + 0.16047689 * centuries
    mean = np.radians((longitude - perihelion) % 360.0)
    eccentric = brentq(lambda x: x - e * np.sin(x) - mean, 0.0, 2.0 * np.pi, xtol=1e-14)
    distance = a * (1.0 - e * np.cos(eccentric))
    receding = np.sqrt(GM_SUN * a) * e * np.sin(eccentric) / distance
    found = sighting("Mercury", moment).station
    assert found.distance == pytest.approx(distance, rel=1e-4)
    assert found.radial_velocity == pytest.approx(receding, abs=1e-4 * np.sqrt(GM_SUN / a))


@pytest.mark.filterwarnings("ignore:.*dubious year")
@pytest.mark.parametrize("moment", MOMENTS)
@pytest.mark.parametrize("name", ["Mercury", "Moon", "Earth", "Mars"])
def test_positions_are_those_of_astropys_own_ephemeris(name, moment):
    time = Time(moment.replace(tzinfo=None), scale="utc")
    with solar_system_ephemeris.set("builtin"):
        place = get_body_barycentric(name.lower(), time) - get_body_barycentric("sun", time)
    # The library keeps light time and the difference of two kinds of dynamical time, milliseconds, apart.
    assert heliocentric_state(name, moment).position == pytest.approx(place.xyz.to_value("m"), abs=2e3)


def test_the_station_is_that_of_the_osculating_orbit():
    known = sighting("Mercury", MOMENTS[1])
    orbit = bodies()["Mercury"].orbit
    on_orbit = station_at_true_anomaly(orbit, known.true_anomaly)
    assert known.station == pytest.approx(on_orbit, rel=2e-4)


def test_the_moons_velocity_is_the_change_of_its_distance():
    hour = 3600
    before, after = (
        sighting("Moon", datetime(2001, 5, 26, 5 + step, tzinfo=UTC)).station.distance for step in (-1, 1)
    )
    found = sighting("Moon", MOMENTS[1]).station
    assert found.radial_velocity == pytest.approx((after - before) / (2 * hour), abs=1.0)
    # Its own motion about the Earth shows: up to 1 km/s on top of the Earth's 0.5.
    assert abs(found.radial_velocity - sighting("Earth", MOMENTS[1]).station.radial_velocity) > 100.0


def test_a_far_future_gives_no_warning_and_nothing_is_downloaded(monkeypatch):
    monkeypatch.setattr("socket.socket", None)
    assert (
        0.3
        < sighting("Mercury", datetime(2099, 12, 31, tzinfo=UTC)).station.distance / ASTRONOMICAL_UNIT
        < 0.47
    )


def test_an_unknown_body_is_a_key_error():
    with pytest.raises(KeyError):
        sighting("Harrow", MOMENTS[0])
