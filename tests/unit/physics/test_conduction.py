"""Heat conduction into the ground against analytic solutions, limits, a general library and the Moon."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from tracer.constants import ASTRONOMICAL_UNIT, STEFAN_BOLTZMANN
from tracer.kernels.surface_map import interpolated
from tracer.physics.conduction import (
    LATITUDES,
    STEPS,
    Ground,
    columns_answer,
    conduction_map,
    depths,
    local_times,
    overhead_light,
    reduced_temperatures,
    response_weights,
    thermal_parameter,
)
from tracer.physics.equilibrium import equilibrium_temperature
from tracer.tally.axes import direction

LUNAR_SOIL = Ground(thermal_inertia=55.0, albedo=0.11, emissivity=0.95)
LUNAR_RATE = 2.0 * np.pi / (29.530589 * 86400.0)
LATITUDE = (np.arange(LATITUDES // 2) + 0.5) * 180.0 / LATITUDES
COSINE = np.cos(np.radians(LATITUDE))


@pytest.mark.parametrize("harmonic", [1, 2, 4])
def test_waves_are_damped_and_lag_as_in_an_endless_column(harmonic):
    # A wave exp(i n phi) at the surface of a half space is exp(-z/d) exp(i(n phi - z/d)) below, d the skin depth
    # sqrt(2 kappa/(n rate)): Carslaw & Jaeger 1959, Conduction of Heat in Solids, section 2.6 (memory).
    wave = columns_answer(np.array([1j * harmonic])).wave[0]
    z = depths() * np.sqrt(harmonic)
    # Three skin depths, a damping by 20; measured 1.7e-3 and 9e-4.
    near = z < 3.0
    assert near.sum() > 50
    np.testing.assert_allclose(np.abs(wave[near]), np.exp(-z[near]), rtol=2.5e-3)
    np.testing.assert_allclose(-np.unwrap(np.angle(wave[near])), z[near], atol=1.5e-3)


@pytest.mark.parametrize("harmonic", [1, 3, 10])
def test_surface_takes_in_heat_an_eighth_of_a_turn_before_it_is_warm(harmonic):
    # Gamma sqrt(n rate) and a lead of 45 deg (Carslaw & Jaeger 1959, section 2.6, memory); here in units of Gamma
    # sqrt(rate). Time steps put in the harmonic's share of a finite step, the whole chain from weights to flux.
    time = 2.0 * np.pi * np.arange(STEPS) / STEPS
    wave = np.cos(harmonic * time)
    flux = np.array([response_weights(1.0) @ np.roll(wave[::-1], n + 1) for n in range(STEPS)])
    found = 2.0 / STEPS * flux @ np.exp(-1j * harmonic * time)
    assert abs(found) == pytest.approx(np.sqrt(harmonic), rel=1e-3 * harmonic**1.5)
    assert np.degrees(np.angle(found)) == pytest.approx(45.0, abs=0.02 * harmonic**2)


def test_a_cooler_moment_never_asks_for_more_light_at_another():
    # What makes Newton's method sure; the weights sum to 0, since constant warmth takes in no heat.
    weights = response_weights(1.0)
    assert weights[0] > 0.0
    assert np.all(weights[1:] < 0.0)
    assert abs(weights.sum()) < 1e-12


@pytest.mark.parametrize("theta", [1e-3, 0.03, 0.5, 10.0])
def test_each_latitude_radiates_in_a_turn_what_it_takes_in(theta):
    u = reduced_temperatures(theta)
    # The day's mean of the cosine of the zenith angle is cos(latitude)/pi.
    np.testing.assert_allclose(np.mean(u**4, axis=1), COSINE / np.pi, rtol=1e-5)


def test_slow_rotator_is_in_equilibrium_by_day():
    u = reduced_temperatures(1e-5)
    phi = (local_times() - 12.0) * np.pi / 12.0
    day = np.abs(phi) < np.radians(75.0)
    expected = (COSINE[:60, np.newaxis] * np.cos(phi[day])) ** 0.25
    np.testing.assert_allclose(u[:60, day], expected, rtol=1e-3)
    assert u[0, 0] < 0.05
    # Not so where the ground keeps its heat.
    assert np.max(np.abs(reduced_temperatures(0.5)[:60, day] / expected - 1.0)) > 0.05


def test_fast_rotator_has_the_temperature_of_the_days_mean():
    u = reduced_temperatures(1e4)
    np.testing.assert_allclose(
        u, np.broadcast_to((COSINE / np.pi)[:, np.newaxis] ** 0.25, u.shape), rtol=2e-4
    )
    assert np.ptp(reduced_temperatures(1.0)[0]) > 0.1


def test_steady_state_is_that_of_a_general_solver_marched_in_time():
    # The same equations by the method of lines on an even grid, stepped by scipy's stiff solver.
    theta, cosine = 0.1, COSINE[30]
    spacing, layers = 0.04, 150
    found = reduced_temperatures(theta)[30]

    def rate(phi, u):
        gap = np.diff(u) / spacing
        light = cosine * max(0.0, np.cos(phi))
        surface = (light - u[0] ** 4) * np.sqrt(2.0) / theta
        flow = np.concatenate(([-surface], gap, [0.0]))
        width = np.full(layers, spacing)
        width[0] = 0.5 * spacing
        return 0.5 * np.diff(flow) / width

    phi = (local_times() - 12.0) * np.pi / 12.0
    # Conduction that does not depend on temperature leaves the mean the same at every depth: start there.
    march = solve_ivp(
        rate,
        (-np.pi, 5.0 * np.pi),
        np.full(layers, found.mean()),
        method="LSODA",
        lband=1,
        uband=1,
        t_eval=4.0 * np.pi + phi,
        rtol=1e-6,
        atol=1e-8,
    )
    # Just after sunrise, where the temperature bends, 0.4 %; elsewhere a tenth of that.
    np.testing.assert_allclose(found, march.y[0], rtol=5e-3)


def test_sun_that_moves_the_other_way_mirrors_the_day():
    forth = conduction_map(LUNAR_SOIL, ASTRONOMICAL_UNIT, LUNAR_RATE)
    back = conduction_map(LUNAR_SOIL, ASTRONOMICAL_UNIT, -LUNAR_RATE)
    np.testing.assert_array_equal(back.values[:, 1:], forth.values[:, :0:-1])
    np.testing.assert_array_equal(back.values[:, 0], forth.values[:, 0])
    assert interpolated(forth, *direction(0.0, 18.5)) > interpolated(forth, *direction(0.0, 5.5)) + 20.0


def test_map_covers_both_hemispheres_alike_and_is_scaled_by_the_subsolar_temperature():
    found = conduction_map(LUNAR_SOIL, ASTRONOMICAL_UNIT, LUNAR_RATE)
    assert found.latitudes.shape == (LATITUDES,)
    np.testing.assert_array_equal(found.latitudes, -found.latitudes[::-1])
    np.testing.assert_array_equal(found.values, found.values[::-1])
    subsolar = equilibrium_temperature(0.11, 0.95, ASTRONOMICAL_UNIT)
    theta = thermal_parameter(LUNAR_SOIL, subsolar, LUNAR_RATE)
    assert theta == pytest.approx(55.0 * LUNAR_RATE**0.5 / (0.95 * STEFAN_BOLTZMANN * subsolar**3), rel=1e-12)
    assert found.values.max() < subsolar
    assert found.values.max() == pytest.approx(subsolar, rel=5e-3)


def test_lunar_soil_has_lunar_nights():
    # Thermal inertia of lunar soil about 55 J m-2 K-1 s-1/2 (Hayne et al. 2017, JGR Planets 122, 2371, memory). The
    # equator, from observed temperatures: 101.8 K at midnight and 95.0 K at dawn (fit of Hurley et al. 2015, Icarus
    # 255, 159). Soil of one conductivity at all depths and temperatures is nearer than 5 % to both.
    found = conduction_map(LUNAR_SOIL, ASTRONOMICAL_UNIT, LUNAR_RATE)
    assert interpolated(found, *direction(0.0, 0.0)) == pytest.approx(101.83, rel=0.05)
    assert interpolated(found, *direction(0.0, 5.5)) == pytest.approx(95.03, rel=0.05)
    # Rock, at forty times the inertia, stays far warmer at night.
    rock = conduction_map(LUNAR_SOIL._replace(thermal_inertia=2200.0), ASTRONOMICAL_UNIT, LUNAR_RATE)
    assert interpolated(rock, *direction(0.0, 0.0)) > 200.0


def test_extreme_ground_is_at_the_limits():
    barren = conduction_map(LUNAR_SOIL._replace(thermal_inertia=1e-30), ASTRONOMICAL_UNIT, LUNAR_RATE)
    assert np.all(barren.values > 0.0)
    solid = conduction_map(LUNAR_SOIL._replace(thermal_inertia=1e30), ASTRONOMICAL_UNIT, LUNAR_RATE)
    assert np.ptp(solid.values, axis=1).max() < 1e-3


def test_light_of_the_steps_sums_to_the_days():
    assert overhead_light().mean() == pytest.approx(1.0 / np.pi, rel=1e-13)
    assert overhead_light().max() == pytest.approx(1.0, abs=1e-4)
    lit = (local_times() > 6.0) & (local_times() < 18.0)
    assert np.all((overhead_light() > 0.0) == lit)
