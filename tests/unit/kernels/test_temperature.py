"""Temperature laws of the ground against published values."""

import numpy as np
import pytest

from tracer.constants import ASTRONOMICAL_UNIT
from tracer.kernels import temperature as laws
from tracer.kernels.surface_map import SurfaceMap
from tracer.kernels.temperature import SurfaceTemperature, temperature, temperatures
from tracer.physics.equilibrium import equilibrium_temperature
from tracer.tally.axes import direction

MOON = SurfaceTemperature(laws.HURLEY_2015, 0.0, 0.0)


def at(law: SurfaceTemperature, latitude: float, local_time: float) -> float:
    return temperature(law, *direction(latitude, local_time))


@pytest.mark.parametrize(
    ("local_time", "kelvin"),
    # Hurley et al. 2015, Icarus 255, 159: on the equator, 0, 90, 180 and 270 deg from the subsolar point through dusk
    # (the fit's coefficients from memory, these values by own evaluation of it).
    [(12.0, 392.00), (18.0, 130.03), (0.0, 101.83), (6.0, 95.03)],
)
def test_moon_on_the_equator(local_time, kelvin):
    assert at(MOON, 0.0, local_time) == pytest.approx(kelvin, abs=0.01)


def test_moons_day_is_the_root_of_the_suns_height_strictly_above_the_horizon():
    for latitude, local_time in ((60.0, 12.0), (-30.0, 9.0), (10.0, 17.9)):
        x = direction(latitude, local_time)[0]
        assert at(MOON, latitude, local_time) == pytest.approx(262.0 * np.sqrt(x) + 130.0, rel=1e-14)
    # The horizon itself is night: at dawn the day law would give 130 K.
    assert temperature(MOON, 0.0, -1.0, 0.0) == pytest.approx(95.03, abs=0.01)
    assert temperature(MOON, 1e-300, -1.0, 0.0) == 130.0


def test_moons_night_cools_towards_the_poles_by_the_sine_of_colatitude():
    for latitude in (-80.0, -45.0, 30.0):
        expected = at(MOON, 0.0, 2.0) + 35.0 * (np.cos(np.radians(latitude)) - 1.0)
        assert at(MOON, latitude, 2.0) == pytest.approx(expected, rel=1e-12)


def test_moons_poles_are_cold_though_they_have_no_longitude():
    for pole in (1.0, -1.0):
        for x, y in ((0.0, 0.0), (-0.0, 0.0), (0.0, -0.0), (-0.0, -0.0)):
            assert 60.0 < temperature(MOON, x, y, pole) < 95.1


@pytest.mark.parametrize(
    ("albedo", "distance_au", "kelvin", "within"),
    # Own evaluation of [(1 - A) S / (eps sigma d^2)]^(1/4) with S = 1361 W m-2, eps = 0.95.
    [
        (0.11, 1.0, 387.2, 0.05),
        (0.03, 2.767, 237.9, 0.05),
        (0.08, 0.3075, 704.0, 0.5),
        (0.18, 2.362, 246.856, 0.001),
    ],
    ids=["Moon", "Ceres", "Mercury", "Vesta"],
)
def test_equilibrium_temperatures_under_the_sun(albedo, distance_au, kelvin, within):
    subsolar = equilibrium_temperature(albedo, 0.95, distance_au * ASTRONOMICAL_UNIT)
    law = SurfaceTemperature(laws.EQUILIBRIUM, subsolar, 50.0)
    assert at(law, 0.0, 12.0) == pytest.approx(kelvin, abs=within)


def test_equilibrium_of_a_black_ball_at_one_au_is_the_textbooks():
    # A perfectly black, perfectly radiating plate under the overhead Sun at 1 au: 393.6 K (1361 W m-2 / sigma)^(1/4),
    # by hand: 1361 / 5.670374e-8 = 2.40019e10; its square root 154925.3; that one's 393.605.
    assert equilibrium_temperature(0.0, 1.0, ASTRONOMICAL_UNIT) == pytest.approx(393.605, abs=0.001)


def test_equilibrium_never_falls_below_the_night():
    law = SurfaceTemperature(laws.EQUILIBRIUM, 387.2, 100.0)
    assert at(law, 0.0, 0.0) == 100.0
    assert at(law, 0.0, 6.001) == 100.0
    for latitude in (0.0, 40.0, 80.0):
        assert at(law, latitude, 12.0) == pytest.approx(
            387.2 * np.cos(np.radians(latitude)) ** 0.25, rel=1e-12
        )


def test_quarter_power_rises_from_the_night_to_the_subsolar_temperature():
    # Mercury at perihelion (memory): 100 K + 600 K cos^(1/4).
    law = SurfaceTemperature(laws.QUARTER_POWER, 700.0, 100.0)
    assert at(law, 0.0, 12.0) == 700.0
    assert at(law, 60.0, 12.0) == pytest.approx(100.0 + 600.0 * 0.5**0.25, rel=1e-12)
    assert at(law, 0.0, 20.0) == 100.0


def test_a_table_is_read_between_its_middles_round_midnight_and_up_to_the_poles():
    table = SurfaceMap(
        np.array([-45.0, 45.0]), np.array([3.0, 9.0, 15.0, 21.0]), np.arange(8.0).reshape(2, 4)
    )
    for code in (laws.MAP, laws.CONDUCTION):
        law = SurfaceTemperature(code, 0.0, 0.0, table)
        assert at(law, 0.0, 12.0) == pytest.approx(0.25 * (1 + 2 + 5 + 6), rel=1e-12)
        assert at(law, -80.0, 0.0) == pytest.approx(0.5 * (3 + 0), rel=1e-12)
        assert at(law, 89.9, 21.0) == pytest.approx(7.0, rel=1e-12)


def test_compiled_laws_equal_their_python_source_and_each_other_at_many_places():
    table = SurfaceMap(
        np.array([-45.0, 45.0]), np.array([3.0, 9.0, 15.0, 21.0]), np.arange(8.0).reshape(2, 4)
    )
    places = np.random.default_rng(8).normal(size=(40, 3))
    places /= np.linalg.norm(places, axis=1)[:, np.newaxis]
    for code in (laws.UNIFORM, laws.QUARTER_POWER, laws.EQUILIBRIUM, laws.HURLEY_2015, laws.MAP):
        law = SurfaceTemperature(code, 400.0, 90.0, table)
        one_by_one = [temperature(law, *place) for place in places]
        np.testing.assert_array_equal(temperatures(law, places), one_by_one)
        plain = [temperature.py_func(law, *place) for place in places]
        np.testing.assert_allclose(one_by_one, plain, rtol=1e-13)
