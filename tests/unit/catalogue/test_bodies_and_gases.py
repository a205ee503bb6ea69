"""The catalogue against handbooks."""

import pytest

from tracer.catalogue.load import bodies, gases, hosts, source_notes


def test_surface_gravity_and_escape_speed_of_mercury_and_the_moon():
    # NASA planetary fact sheets (memory): 3.70 and 1.62 m s-2, 4.3 and 2.38 km/s.
    for name, gravity, escape in (("Mercury", 3.70, 4300.0), ("Moon", 1.62, 2380.0)):
        body = bodies()[name]
        assert body.gm / body.radius**2 == pytest.approx(gravity, rel=0.005)
        assert (2.0 * body.gm / body.radius) ** 0.5 == pytest.approx(escape, rel=0.015)


def test_moons_move_with_their_hosts():
    assert bodies()["Europa"].heliocentric_orbit == hosts()["Jupiter"].orbit
    assert bodies()["Ceres"].heliocentric_orbit == bodies()["Ceres"].orbit


def test_moon_obeys_keplers_third_law():
    moon = bodies()["Moon"]
    period = 2.0 * 3.141592653589793 * (moon.orbit.semi_major_axis**3 / (moon.host.gm + moon.gm)) ** 0.5
    # Locked: it turns once a sidereal month. The Sun's pull makes the mean month longer than two bodies' by 0.5 %.
    assert period == pytest.approx(moon.rotation_period, rel=0.01)


def test_masses_are_sums_of_their_atoms():
    gas = {name: one.mass for name, one in gases().items()}
    assert gas["H2O"] == pytest.approx(2 * gas["H"] + gas["O"], rel=1e-4)
    assert gas["CO2"] == pytest.approx(gas["C"] + 2 * gas["O"], rel=1e-4)
    assert gas["CH4"] == pytest.approx(gas["C"] + 4 * gas["H"], rel=1e-4)


def test_every_file_says_where_its_values_come_from():
    for name in ("bodies.csv", "hosts.csv", "gases.csv", "lines.csv", "photo_rates_1au.csv"):
        assert "memory" in source_notes(name)
