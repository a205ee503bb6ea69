"""Claims about flights that have an answer in closed form."""

import math

import numpy as np
import pytest

from tracer.kernels.compiling import allocating_kernel
from tracer.kernels.dense_output import CURVE_SIZE, CURVE_ZONE, FLOWN, place_at
from tracer.kernels.integrated_flight import (
    AGED,
    CROSSED,
    FLIGHT_SIZE,
    FLYING,
    LANDED,
    UNRESOLVED,
    advance,
    fly,
    new_curve,
    new_flight,
    start_flight,
)
from tracer.kernels.motion import rates_of_change
from tracer.kernels.shadow import zone_at
from tracer.physics.orbit import Station, station_at_distance
from tracer.physics.sunlight import conditions_of, forces_of, losses_of, shadow_of

FAR = 1e30
"""A Sun so far [m] that its light comes from one direction and does not thin."""

AU = 1.495978707e11
MERCURY = (2.2031868e13, 2439.4e3)
MOON = (4.9028e12, 1737.4e3)
GRAVITY = MERCURY[0] / MERCURY[1] ** 2


def lone_body(body, outer_radii=1000.0, losses=None):
    """A body far from any Sun: gravity alone."""
    gm, radius = body
    forces = forces_of(
        gm=gm,
        radius=radius,
        outer_radius=outer_radii * radius,
        station=Station(FAR, 0.0, 0.0),
        tide=False,
        push=0.0,
    )
    return conditions_of(forces, losses or losses_of(), shadow_of("none", radius, FAR))


def pushed_body(body, push, outer_radii=1000.0):
    """A body in a uniform push [m s-2] along -x, without shadow, tide or turning."""
    conditions = lone_body(body, outer_radii)
    forces = conditions.sky.forces._replace(push=push * (FAR / AU) ** 2)
    return conditions._replace(sky=conditions.sky._replace(forces=forces))


def flown(conditions, position, velocity, tolerance=1e-11, time_limit=1e9):
    """Fly to the end and return (ending, flight)."""
    flight, curve = new_flight(), new_curve()
    start_flight(flight, conditions, tolerance, *position, *velocity)
    return fly(flight, curve, conditions, tolerance, time_limit), flight


@pytest.mark.parametrize(
    ("body", "speed", "zenith_angle", "time", "arc"),
    [
        # Two-body hops, computed for this project from Kepler's equation.
        (MOON, 500.0, 45.0, 469.663, 5.30743),
        (MOON, 1000.0, 45.0, 1211.588, 24.30491),
        (MOON, 2000.0, 80.0, 13669.123, 294.20505),
        (MERCURY, 2000.0, 45.0, 1168.782, 31.75439),
    ],
)
def test_hop_without_sun_is_a_kepler_arc(body, speed, zenith_angle, time, arc):
    radius = body[1]
    psi = math.radians(zenith_angle)
    ending, flight = flown(
        lone_body(body), (0.0, 0.0, radius), (speed * math.sin(psi), 0.0, speed * math.cos(psi))
    )
    assert ending == LANDED
    assert flight[0] == pytest.approx(time, rel=1e-6)
    assert math.degrees(math.atan2(flight[1], flight[3])) % 360.0 == pytest.approx(arc, rel=1e-6)
    assert math.hypot(flight[1], flight[3]) == pytest.approx(radius, rel=1e-11)
    assert math.hypot(flight[4], flight[6]) == pytest.approx(speed, rel=1e-9)


def test_hop_agrees_with_closed_form_to_all_digits():
    gm, radius = MERCURY
    climb, across = 1800.0, 900.0
    energy = 0.5 * (climb**2 + across**2) - gm / radius
    a = -0.5 * gm / energy
    e = math.sqrt(1.0 - (radius * across) ** 2 / (gm * a))
    anomaly = math.acos((1.0 - radius / a) / e)
    time = 2.0 * math.sqrt(a**3 / gm) * (math.pi - anomaly + e * math.sin(anomaly))
    _, flight = flown(lone_body(MERCURY), (radius, 0.0, 0.0), (climb, across, 0.0))
    assert flight[0] == pytest.approx(time, rel=1e-10)


def test_uniform_push_conserves_energy():
    push = 0.25 * GRAVITY
    conditions = pushed_body(MERCURY, push)
    gm, radius = MERCURY
    for angle in (0.3, 1.0, 2.0, 2.9):
        position = radius * np.array([math.cos(angle), math.sin(angle), 0.0])
        velocity = 2800.0 * position / radius + np.array([100.0, -300.0, 200.0])
        _, flight = flown(conditions, position, velocity, time_limit=2e4)
        end, speed = flight[1:4], flight[4:7]
        before = 0.5 * velocity @ velocity - gm / radius + push * position[0]
        after = 0.5 * speed @ speed - gm / math.sqrt(end @ end) + push * end[0]
        assert after == pytest.approx(before, abs=1e-8 * gm / radius)


def test_push_of_a_quarter_of_gravity_balances_it_two_radii_behind():
    conditions = pushed_body(MERCURY, 0.25 * GRAVITY)
    behind = (-2.0 * MERCURY[1], 0.0, 0.0)
    there, _ = rates_of_change(conditions.sky, conditions.push_tables, 0, behind, (0.0, 0.0, 0.0))
    assert np.abs(there).max() < 1e-12 * GRAVITY


def test_sunward_launch_without_gravity_turns_at_the_ballistic_apex():
    push, speed, radius = 0.5, 1000.0, 1e3
    conditions = pushed_body((0.0, radius), push, outer_radii=1e4)
    ending, flight = flown(conditions, (radius, 0.0, 0.0), (speed, 0.0, 0.0), time_limit=speed / push)
    assert ending == AGED
    assert flight[1] - radius == pytest.approx(speed**2 / (2.0 * push), rel=1e-10)
    ending, flight = flown(conditions, (radius, 0.0, 0.0), (speed, 0.0, 0.0))
    assert ending == LANDED
    assert flight[0] == pytest.approx(2.0 * speed / push, rel=1e-10)


def test_straight_way_stays_straight_seen_from_a_turning_frame():
    rate = 1e-4
    conditions = lone_body((0.0, 1e6))
    forces = conditions.sky.forces._replace(turning=rate)
    conditions = conditions._replace(sky=conditions.sky._replace(forces=forces))
    start, velocity = np.array([1e6, 0.0, 0.0]), np.array([800.0, 300.0, 200.0])
    spin = np.cross([0.0, 0.0, rate], start)
    ending, flight = flown(conditions, start, velocity - spin, time_limit=2e4)
    assert ending == AGED
    c, s = math.cos(rate * flight[0]), math.sin(rate * flight[0])
    back = np.array([c * flight[1] - s * flight[2], s * flight[1] + c * flight[2], flight[3]])
    assert back == pytest.approx(start + velocity * flight[0], rel=1e-9)


def test_escaping_atom_is_stopped_on_the_outer_sphere():
    gm, radius = MERCURY
    ending, flight = flown(lone_body(MERCURY, outer_radii=30.0), (0.0, radius, 0.0), (0.0, 5000.0, 0.0))
    assert ending == CROSSED
    assert np.linalg.norm(flight[1:4]) == pytest.approx(30.0 * radius, rel=1e-11)
    assert flight[5] == pytest.approx(
        math.sqrt(5000.0**2 - 2.0 * gm / radius * (1.0 - 1.0 / 30.0)), rel=1e-10
    )


@pytest.mark.parametrize("excess", [1e-3, 1e-6, 1e-9])
def test_apex_just_over_the_outer_sphere_is_a_crossing(excess):
    gm, radius = MERCURY
    apex = 3.0 * radius
    speed = math.sqrt(2.0 * gm * (1.0 / radius - 1.0 / apex))
    over = lone_body(MERCURY, outer_radii=3.0 * (1.0 - excess))
    under = lone_body(MERCURY, outer_radii=3.0 * (1.0 + excess))
    assert flown(over, (0.0, radius, 0.0), (0.0, speed, 0.0))[0] == CROSSED
    assert flown(under, (0.0, radius, 0.0), (0.0, speed, 0.0))[0] == LANDED


@pytest.mark.parametrize("climb", [10.0, 0.1, 1e-6])
def test_flattest_hops_land_in_time(climb):
    gm, radius = MERCURY
    across = 500.0
    ending, flight = flown(lone_body(MERCURY), (radius, 0.0, 0.0), (climb, across, 0.0), tolerance=1e-6)
    assert ending == LANDED
    # The landing's 1e-9 radii in height are all there is of the lowest hop.
    expected = 2.0 * climb / (gm / radius**2 - across**2 / radius)
    assert flight[0] == pytest.approx(expected, rel=2e-3, abs=math.sqrt(1e-9 * radius / GRAVITY))


def test_grazing_way_past_the_ground_does_not_land_and_a_lower_one_does():
    gm, radius = MERCURY
    for perigee, ending in ((radius * (1.0 + 1e-6), CROSSED), (radius * (1.0 - 1e-6), LANDED)):
        far = 8.0 * radius
        speed_there = math.sqrt(2.0 * (3e6 + gm / far))
        across = perigee * math.sqrt(2.0 * (3e6 + gm / perigee)) / far
        inward = math.sqrt(speed_there**2 - across**2)
        conditions = lone_body(MERCURY, outer_radii=10.0)
        assert flown(conditions, (far, 0.0, 0.0), (-inward, across, 0.0), tolerance=1e-9)[0] == ending


def test_age_limit_stops_a_flight_on_time():
    ending, flight = flown(lone_body(MERCURY), (MERCURY[1], 0.0, 0.0), (2000.0, 0.0, 0.0), time_limit=321.0)
    assert ending == AGED
    assert flight[0] == pytest.approx(321.0, rel=1e-15)


def test_flight_that_is_not_a_number_is_unresolved():
    assert flown(lone_body(MERCURY), (MERCURY[1], 0.0, 0.0), (math.nan, 0.0, 0.0))[0] == UNRESOLVED


def test_constant_loss_makes_hazard_rate_times_time():
    conditions = lone_body(MERCURY, losses=losses_of(other_everywhere=1e-4))
    _, flight = flown(conditions, (MERCURY[1], 0.0, 0.0), (2000.0, 0.0, 0.0))
    assert flight[7] == 0.0
    assert flight[8] == pytest.approx(1e-4 * flight[0], rel=1e-12)


def sunlit_body(shadow, distance=0.35 * AU, outer_radii=300.0):
    """Mercury in sunlight with a push of 0.2 m/s2 at 1 au and both kinds of photo-loss."""
    gm, radius = MERCURY
    forces = forces_of(
        gm=gm,
        radius=radius,
        outer_radius=outer_radii * radius,
        station=station_at_distance(None, distance, 8e3),
        tide=True,
        push=0.2,
    )
    losses = losses_of(ionizing=5.9e-6, other_sunlight=1e-6, other_lit=1e-6)
    return conditions_of(forces, losses, shadow_of(shadow, radius, distance))


@pytest.mark.parametrize("shadow", ["penumbra", "cylinder"])
def test_losses_in_the_dark_are_zero(shadow):
    _, flight = flown(sunlit_body(shadow), (-MERCURY[1], 0.0, 0.0), (-1500.0, 100.0, 0.0))
    assert flight[7] == 0.0
    assert flight[8] == 0.0
    _, flight = flown(sunlit_body("none"), (-MERCURY[1], 0.0, 0.0), (-1500.0, 100.0, 0.0))
    assert flight[7] > 0.0
    assert flight[8] > 0.0


@allocating_kernel
def wrong_zones(conditions, tolerance, positions, velocities):
    """Return how many steps hold a point in another zone of the shadow, underground or outside, and all steps."""
    flight, curve = np.zeros(FLIGHT_SIZE), np.zeros(CURVE_SIZE)
    forces = conditions.sky.forces
    wrong, steps = 0, 0
    for i in range(positions.shape[0]):
        p, v = positions[i], velocities[i]
        start_flight(flight, conditions, tolerance, p[0], p[1], p[2], v[0], v[1], v[2])
        standing = FLYING
        while standing == FLYING:
            standing = advance(flight, curve, conditions, tolerance, 1e7)
            steps += 1
            for k in range(1, 30):
                x, y, z, _, _, _ = place_at(curve, curve[FLOWN] * k / 30)
                r = math.sqrt(x * x + y * y + z * z)
                inside = forces.radius * (1.0 - 1e-10) < r < forces.outer_radius * (1.0 + 1e-10)
                if not inside or zone_at(conditions.sky.shadow, x, y, z) != int(curve[CURVE_ZONE]):
                    wrong += 1
                    break
    return wrong, steps


@pytest.mark.parametrize("shadow", ["penumbra", "cylinder"])
def test_no_step_skips_a_chord_of_shadow_ground_or_outer_sphere(shadow):
    rng = np.random.default_rng(7)
    place = rng.normal(size=(20000, 3))
    up = place / np.linalg.norm(place, axis=1)[:, None]
    velocity = up * rng.uniform(100.0, 4500.0, size=(20000, 1)) + rng.normal(scale=800.0, size=(20000, 3))
    velocity *= np.sign(np.sum(velocity * up, axis=1))[:, None]
    wrong, steps = wrong_zones(sunlit_body(shadow), 1e-6, MERCURY[1] * up, velocity)
    assert steps > 100_000
    assert wrong == 0
