"""A body that travels on its orbit: the turning, breathing frame against mechanics in inertial coordinates."""

import math

import numpy as np
import pytest
from numba import njit
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from tracer.catalogue.lines import lines_of
from tracer.catalogue.load import bodies, gases, hosts
from tracer.constants import ASTRONOMICAL_UNIT, GM_SUN, PLANCK
from tracer.kernels.dense_output import CURVE_ZONE, FLOWN, LENGTH, START, place_at
from tracer.kernels.endings import AGED, CROSSED, FLYING
from tracer.kernels.integrated_flight import (
    PLACE,
    TIME,
    advance,
    fly,
    new_curve,
    new_flight,
    start_flight,
)
from tracer.kernels.shadow import zone_at
from tracer.kernels.sunlight import visible_fraction
from tracer.kernels.two_body import orbit_state
from tracer.physics.lines import catalogue_table, push_tables
from tracer.physics.orbit import orbit_through, station_at_true_anomaly
from tracer.physics.photo_losses import photo_loss
from tracer.physics.sunlight import conditions_of, forces_of, losses_of, shadow_of

MERCURY = bodies()["Mercury"]
SUN_RADIUS = hosts()["Sun"].radius
SODIUM = gases()["Na"].mass
TABLES = [table for table in map(catalogue_table, lines_of("Na")) if table is not None]
KNOTS = [table.first_velocity + table.velocity_step * np.arange(table.g.size) for table in TABLES]
PUSHES = [table.g * PLANCK / (SODIUM * table.wavelength) for table in TABLES]
IONIZING = photo_loss("Na", 0.0).ionizing
DAY = 86400.0


def conditions(true_anomaly, *, gm, lines, outer_radii, moving=True):
    station = station_at_true_anomaly(MERCURY.heliocentric_orbit, true_anomaly)
    forces = forces_of(
        gm=gm,
        radius=MERCURY.radius,
        outer_radius=outer_radii * MERCURY.radius,
        station=station,
        tide=True,
        push=0.0,
        orbit=orbit_through(station) if moving else None,
    )
    shadow = shadow_of("penumbra" if lines else "none", MERCURY.radius, station.distance)
    losses = losses_of(ionizing=IONIZING if lines else 0.0)
    return conditions_of(forces, losses, shadow, push_tables(TABLES if lines else [], SODIUM))


def flown(of, position, velocity, tolerance, time):
    """Return (ending, time, state (6,)) of a flight for at most `time`."""
    flight, curve = new_flight(), new_curve()
    start_flight(flight, of, tolerance, *position, *velocity)
    ending = fly(flight, curve, of, tolerance, time)
    return ending, flight[TIME], flight[PLACE : PLACE + 6].copy()


def kepler(orbit, time):
    """Return (distance, radial velocity, true anomaly) of two-body motion: Kepler's equation by bracketing."""
    e = orbit.eccentricity
    m = orbit.mean_anomaly + orbit.mean_motion * time
    big = brentq(lambda x: x - e * math.sin(x) - m, m - 1.0, m + 1.0, xtol=1e-15, rtol=1e-15)
    f = 2.0 * math.atan2(math.sqrt(1 + e) * math.sin(big / 2), math.sqrt(1 - e) * math.cos(big / 2))
    distance = orbit.semi_major_axis * (1.0 - e * math.cos(big))
    return distance, orbit.gm / orbit.angular_momentum * e * math.sin(f), f


def inertial(orbit, time, state):
    """Return heliocentric position and velocity, each (3,), of an atom with Sun-fixed `state` at `time`."""
    d, v_r, f = kepler(orbit, time)
    turning = orbit.angular_momentum / d**2
    # The body lies along the unit vector n from the Sun; +x points back to the Sun, +y against the motion.
    n, t = np.array([math.cos(f), math.sin(f), 0.0]), np.array([-math.sin(f), math.cos(f), 0.0])
    x, y, z, vx, vy, vz = state
    up = np.array([0.0, 0.0, 1.0])
    position = (d - x) * n - y * t + z * up
    velocity = (v_r - vx + turning * y) * n + ((d - x) * turning - vy) * t + vz * up
    return position, velocity


@pytest.mark.parametrize("eccentricity", [0.0, 0.2056, 0.7, 0.95])
def test_body_follows_keplers_laws(eccentricity):
    orbit = MERCURY.heliocentric_orbit
    orbit = orbit_through(station_at_true_anomaly(type(orbit)(orbit.semi_major_axis, eccentricity), 75.0))
    period = 2.0 * math.pi / orbit.mean_motion
    for time in np.linspace(-1.3, 1.3, 27) * period:
        distance, velocity, _ = kepler(orbit, time)
        found = orbit_state(orbit, time)
        scale = math.sqrt(GM_SUN / distance)
        assert found[0] == pytest.approx(distance, rel=2e-13)
        assert found[1] == pytest.approx(velocity, abs=2e-12 * scale)


def test_orbit_through_a_station_passes_it():
    station = station_at_true_anomaly(MERCURY.heliocentric_orbit, 250.0)
    orbit = orbit_through(station)
    assert orbit.semi_major_axis == pytest.approx(MERCURY.heliocentric_orbit.semi_major_axis, rel=1e-14)
    assert orbit.eccentricity == pytest.approx(MERCURY.heliocentric_orbit.eccentricity, rel=1e-14)
    distance, velocity = orbit_state(orbit, 0.0)
    assert distance == pytest.approx(station.distance, rel=1e-14)
    assert velocity == pytest.approx(station.radial_velocity, rel=1e-13)
    # 88 days: Mercury's year.
    assert 2.0 * math.pi / orbit.mean_motion / DAY == pytest.approx(87.97, abs=0.01)


@pytest.mark.parametrize("true_anomaly", [0.0, 110.0, 250.0])
def test_without_gravity_and_light_energy_and_angular_momentum_about_the_sun_are_kept(true_anomaly):
    of = conditions(true_anomaly, gm=0.0, lines=False, outer_radii=1e5)
    orbit = of.sky.forces.orbit
    launch = (*(MERCURY.radius * np.array([0.6, 0.0, 0.8])), 2000.0, -1500.0, 1800.0)
    ending, time, state = flown(of, launch[:3], launch[3:], 1e-12, 30.0 * DAY)
    assert ending == AGED
    assert time == 30.0 * DAY

    def integrals(when, state):
        r, v = inertial(orbit, when, state)
        return 0.5 * v @ v - GM_SUN / np.linalg.norm(r), np.cross(r, v)

    (energy, momentum), (end_energy, end_momentum) = integrals(0.0, launch), integrals(time, state)
    assert abs(end_energy / energy - 1.0) < 1e-9
    assert np.linalg.norm(end_momentum - momentum) < 1e-9 * np.linalg.norm(momentum)


@njit(error_model="numpy")
def heliocentric_slopes(_time, y, gm, radius, knots2, push2, knots1, push1, rate):
    """Body and atom about the Sun, along fixed axes: the atom's push and loss by its own velocity and distance."""
    body, atom, v = y[0:3], y[6:9], y[9:12]
    d = math.sqrt(body[0] ** 2 + body[1] ** 2 + body[2] ** 2)
    far = math.sqrt(atom[0] ** 2 + atom[1] ** 2 + atom[2] ** 2)
    gap = atom - body
    r = math.sqrt(gap[0] ** 2 + gap[1] ** 2 + gap[2] ** 2)
    x = -(gap[0] * body[0] + gap[1] * body[1] + gap[2] * body[2]) / d
    across = math.sqrt(max(0.0, r * r - x * x))
    lit = visible_fraction(x, across, 0.0, d, radius, SUN_RADIUS)
    receding = (atom[0] * v[0] + atom[1] * v[1] + atom[2] * v[2]) / far
    light = lit * (ASTRONOMICAL_UNIT / far) ** 2
    b = light * (np.interp(receding, knots2, push2) + np.interp(receding, knots1, push1))
    out = np.empty(13)
    out[0:3] = y[3:6]
    out[3:6] = -GM_SUN * body / d**3
    out[6:9] = v
    out[9:12] = -GM_SUN * atom / far**3 - gm * gap / r**3 + b * atom / far
    out[12] = light * rate
    return out


@pytest.mark.parametrize(
    ("true_anomaly", "up", "velocity"),
    [
        (60.0, (0.0, 0.0, 1.0), (0.0, 800.0, 3600.0)),
        # Through penumbra, umbra and antumbra: down the tail's axis from the night side.
        (60.0, (-1.0, 0.0, 0.0), (-4400.0, 30.0, 20.0)),
        (300.0, (0.2, -0.6, 0.7745966692414834), (-500.0, -2800.0, 3400.0)),
    ],
)
def test_flight_to_500_radii_agrees_with_an_eighth_order_integrator_in_inertial_coordinates(
    true_anomaly, up, velocity
):
    """DOP853: Hairer, Norsett & Wanner 1993, Solving Ordinary Differential Equations I, section II.10."""
    of = conditions(true_anomaly, gm=MERCURY.gm, lines=True, outer_radii=500.0)
    orbit = of.sky.forces.orbit
    launch = np.array([*(MERCURY.radius * np.array(up)), *velocity])
    ending, time, state = flown(of, launch[:3], launch[3:], 1e-11, 30.0 * DAY)
    assert ending == CROSSED
    start = [np.concatenate(inertial(orbit, 0.0, six)) for six in (np.zeros(6), launch)]
    solution = solve_ivp(
        heliocentric_slopes,
        (0.0, time),
        [*start[0], *start[1], 0.0],
        method="DOP853",
        rtol=1e-13,
        max_step=200.0,
        atol=[1e-3] * 3 + [1e-8] * 3 + [1e-3] * 3 + [1e-8] * 3 + [1e-13],
        args=(MERCURY.gm, MERCURY.radius, KNOTS[0], PUSHES[0], KNOTS[1], PUSHES[1], IONIZING),
    )
    place, speed = inertial(orbit, time, state)
    assert np.linalg.norm(place - solution.y[6:9, -1]) < 1e-4 * MERCURY.radius
    assert np.linalg.norm(speed - solution.y[9:12, -1]) < 1e-5 * np.linalg.norm(velocity)
    # The stationary frame ends elsewhere: the check would see a missing term.
    still = conditions(true_anomaly, gm=MERCURY.gm, lines=True, outer_radii=500.0, moving=False)
    _, _, other = flown(still, launch[:3], launch[3:], 1e-9, time)
    assert np.linalg.norm(other[:3] - state[:3]) > 1e-2 * MERCURY.radius


def test_zones_are_those_of_the_shadow_at_the_moment():
    """Flights down the tail, a few days long: within a step the zone is the one at each moment's own place."""
    of = conditions(60.0, gm=0.0, lines=True, outer_radii=2000.0)
    sky, rng = of.sky, np.random.default_rng(4)
    checked = 0
    for _ in range(40):
        flight, curve = new_flight(), new_curve()
        y, z = rng.normal(size=2) * 0.5 * MERCURY.radius
        x = -math.sqrt(MERCURY.radius**2 * 1.0001 - min(y * y + z * z, MERCURY.radius**2))
        start_flight(flight, of, 1e-6, x, y, z, -300.0, *(rng.normal(size=2) * 3.0))
        standing = FLYING
        while standing == FLYING:
            standing = advance(flight, curve, of, 1e-6, 8.0 * DAY)
            for part in (0.25, 0.5, 0.75):
                here = part * curve[FLOWN]
                distance, _ = orbit_state(sky.forces.orbit, curve[START] + here * curve[LENGTH])
                shadow = shadow_of("penumbra", MERCURY.radius, distance)
                x, y, z = place_at(curve, here)[:3]
                inside = x * x + y * y + z * z < MERCURY.radius**2
                assert inside or zone_at(shadow, x, y, z) == int(curve[CURVE_ZONE])
                checked += 1
    assert checked > 1000
