"""The integrator against an eighth-order one on the same equations, written here anew."""

import math

import numpy as np
import pytest
from numba import njit
from scipy.integrate import solve_ivp

from tracer.catalogue.lines import lines_of
from tracer.catalogue.load import bodies, gases
from tracer.constants import ASTRONOMICAL_UNIT, BOLTZMANN, GM_SUN, PLANCK
from tracer.kernels.integrated_flight import CROSSED, LANDED, fly, new_curve, new_flight, start_flight
from tracer.kernels.step_control import DEFAULT_TOLERANCE
from tracer.kernels.sunlight import visible_fraction
from tracer.physics.lines import catalogue_table, push_tables
from tracer.physics.orbit import station_at_true_anomaly
from tracer.physics.photo_losses import photo_loss
from tracer.physics.sunlight import conditions_of, forces_of, losses_of, shadow_of

MERCURY = bodies()["Mercury"]
SODIUM = gases()["Na"].mass
STATION = station_at_true_anomaly(MERCURY.heliocentric_orbit, 60.0)
TABLES = [table for table in map(catalogue_table, lines_of("Na")) if table is not None]
OUTER_RADIUS = 20.0 * MERCURY.radius
SUN_RADIUS = 6.957e8
DAYS = 86400.0


def sodium_conditions(shadow="penumbra", direction=1.0):
    """Sodium over Mercury at true anomaly 60 deg with push, tide, turning frame and losses."""
    loss = photo_loss("Na", 0.0)
    forces = forces_of(
        gm=MERCURY.gm,
        radius=MERCURY.radius,
        outer_radius=OUTER_RADIUS,
        station=STATION,
        tide=True,
        push=0.0,
    )
    return conditions_of(
        forces,
        losses_of(ionizing=loss.ionizing, other_sunlight=loss.other),
        shadow_of(shadow, MERCURY.radius, STATION.distance),
        direction * push_tables(TABLES, SODIUM) if direction == 1.0 else reversed_push(),
    )


def reversed_push():
    """The lines' tables with the push towards the Sun, as a wrong sign would have it."""
    tables = [table._replace(g=-table.g) for table in TABLES]
    return push_tables(tables, SODIUM)


def random_launches(count, temperature, seed):
    """Flux-Maxwellian launches by the cosine law from places all over the ground: positions, velocities."""
    rng = np.random.default_rng(seed)
    place = rng.normal(size=(count, 3))
    up = place / np.linalg.norm(place, axis=1)[:, None]
    speed = np.sqrt(2.0 * BOLTZMANN * temperature / SODIUM * rng.gamma(2.0, size=count))
    side = np.cross(up, rng.normal(size=(count, 3)))
    side /= np.linalg.norm(side, axis=1)[:, None]
    cosine = np.sqrt(rng.random(count))
    direction = cosine[:, None] * up + np.sqrt(1.0 - cosine**2)[:, None] * side
    return MERCURY.radius * up, speed[:, None] * direction


def integrated(conditions, position, velocity, tolerance):
    """Fly one atom to its end: fate, time, position, survival."""
    flight, curve = new_flight(), new_curve()
    start_flight(flight, conditions, tolerance, *position, *velocity)
    ending = fly(flight, curve, conditions, tolerance, 30.0 * DAYS)
    return ending, flight[0], flight[1:4].copy(), math.exp(-flight[7] - flight[8])


KNOTS = [table.first_velocity + table.velocity_step * np.arange(table.g.size) for table in TABLES]
PUSHES = [table.g * PLANCK / (SODIUM * table.wavelength) for table in TABLES]


@njit(error_model="numpy")
def slopes(_time, y, gm, radius, d, v_r, turning, knots2, push2, knots1, push1, rate):
    r = y[:3]
    v = y[3:6]
    to_sun = np.array([d, 0.0, 0.0]) - r
    sun_distance = math.sqrt((to_sun * to_sun).sum())
    away = -to_sun / sun_distance
    lit = visible_fraction(r[0], r[1], r[2], d, radius, 6.957e8)
    heliocentric = (away * v).sum() - v_r * away[0]
    dilution = (ASTRONOMICAL_UNIT / sun_distance) ** 2
    b = lit * dilution * (np.interp(heliocentric, knots2, push2) + np.interp(heliocentric, knots1, push1))
    spin = np.array([0.0, 0.0, turning])
    a = -gm * r / (r * r).sum() ** 1.5 + GM_SUN * to_sun / sun_distance**3 - GM_SUN / d**2 * np.array([1.0, 0, 0])
    a += b * away - 2.0 * np.cross(spin, v) - np.cross(spin, np.cross(spin, r))
    out = np.empty(7)
    out[:3] = v
    out[3:6] = a
    out[6] = lit * dilution * rate
    return out


def reference(position, velocity):
    """The same flight by DOP853 (Hairer, Norsett & Wanner 1993) at 1e-12: time, position, survival."""

    def over_ground(_time, y, *_):
        return math.sqrt(y[0] * y[0] + y[1] * y[1] + y[2] * y[2]) - MERCURY.radius

    def under_sphere(_time, y, *_):
        return OUTER_RADIUS - math.sqrt(y[0] * y[0] + y[1] * y[1] + y[2] * y[2])

    for event in (over_ground, under_sphere):
        event.terminal, event.direction = True, -1
    arguments = (MERCURY.gm, MERCURY.radius, STATION.distance, STATION.radial_velocity, STATION.orbital_rate)
    arguments += (KNOTS[0], PUSHES[0], KNOTS[1], PUSHES[1], photo_loss("Na", 0.0).ionizing)
    solution = solve_ivp(
        slopes,
        (0.0, 30.0 * DAYS),
        [*position, *velocity, 0.0],
        method="DOP853",
        rtol=1e-12,
        atol=[1e-6] * 3 + [1e-9] * 3 + [1e-13],
        events=(over_ground, under_sphere),
        args=arguments,
    )
    return solution.t[-1], solution.y[:3, -1], math.exp(-solution.y[6, -1])


def compared(count, temperature, seed, tolerance):
    """Differences from the reference over random launches: place [radii], time (relative), survival; n rows."""
    conditions = sodium_conditions()
    rows = []
    for position, velocity in zip(*random_launches(count, temperature, seed), strict=True):
        ending, time, place, survival = integrated(conditions, position, velocity, tolerance)
        true_time, true_place, true_survival = reference(position, velocity)
        miss = np.linalg.norm(place - true_place) / MERCURY.radius
        rows.append((ending, miss, abs(time / true_time - 1.0), abs(survival - true_survival)))
    return np.array(rows)
