"""A moon beside its host: the restricted three-body problem, the host's shadow and its sphere.

Constants of Earth and Moon stand for any host and moon; the moon's rate is that of a circle, so that both are free.
"""

import math
from datetime import UTC, datetime, timedelta

import numpy as np
import pytest
from astropy.coordinates import get_body_barycentric, solar_system_ephemeris
from astropy.time import Time
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from tracer.catalogue.lines import lines_of
from tracer.catalogue.load import bodies, gases, hosts
from tracer.constants import ASTRONOMICAL_UNIT, GM_SUN, PLANCK
from tracer.kernels.dense_output import FLOWN, LENGTH, START, place_at
from tracer.kernels.endings import AGED, CROSSED, FLYING, LANDED, STRUCK
from tracer.kernels.host import past_host
from tracer.kernels.integrated_flight import (
    HAZARDS,
    PLACE,
    TIME,
    advance,
    fly,
    new_curve,
    new_flight,
    start_flight,
)
from tracer.kernels.motion import radial_velocity, rates_beside
from tracer.kernels.orbit import body_on_orbit
from tracer.kernels.sunlight import visible_fraction
from tracer.physics.ephemeris import moon_sighting
from tracer.physics.host import (
    kepler_period,
    moon_as_seen,
    moon_at_phase,
    moon_without_sun,
    moving_host,
    still_host,
)
from tracer.physics.lines import catalogue_table, push_tables
from tracer.physics.orbit import Station, orbit_through, station_at_true_anomaly
from tracer.physics.photo_losses import photo_loss
from tracer.physics.sunlight import conditions_of, forces_of, losses_of, shadow_of

MOON, EARTH = bodies()["Moon"], hosts()["Earth"]
SUN_RADIUS = hosts()["Sun"].radius
DISTANCE = MOON.orbit.semi_major_axis
PERIOD = kepler_period(DISTANCE, EARTH.gm + MOON.gm)
RATE = 2.0 * math.pi / PERIOD
SODIUM = gases()["Na"].mass
TABLES = [table for table in map(catalogue_table, lines_of("Na")) if table is not None]
KNOTS = [table.first_velocity + table.velocity_step * np.arange(table.g.size) for table in TABLES]
PUSHES = [table.g * PLANCK / (SODIUM * table.wavelength) for table in TABLES]
IONIZING = photo_loss("Na", 0.0).ionizing
DAY = 86400.0


def dark(phase, *, gm=MOON.gm, host_gm=EARTH.gm, rate=RATE, falls=True):
    """Moon and host alone, without a Sun; `falls` False leaves out the host's pull on the moon, as a wrong frame would.

    Nothing lands: the moon's radius is 1 m.
    """
    moon = moon_without_sun(DISTANCE, rate, phase)
    host = still_host(host_gm, EARTH.radius, moon, False)
    if not falls:
        host = host._replace(per_gap3=0.0)
    forces = forces_of(
        gm=gm,
        radius=1.0,
        outer_radius=100.0 * DISTANCE,
        station=Station(ASTRONOMICAL_UNIT, 0.0, rate),
        tide=False,
        push=0.0,
        host=host,
    )
    return conditions_of(forces, losses_of(), shadow_of("none", 1.0, ASTRONOMICAL_UNIT))


def lit(phase, *, moving=False, lines=True, true_anomaly=60.0):
    """The Moon under the Sun: pushed, ionised, eclipsed."""
    station = station_at_true_anomaly(EARTH.orbit, true_anomaly)
    moon = moon_at_phase(station, DISTANCE, RATE, phase)
    orbit = orbit_through(station) if moving else None
    if moving:
        host = moving_host(EARTH.gm, EARTH.radius, moon, orbit, True)
    else:
        host = still_host(EARTH.gm, EARTH.radius, moon, True)
        station = moon.station._replace(orbital_rate=RATE)
    forces = forces_of(
        gm=MOON.gm,
        radius=MOON.radius,
        outer_radius=30.0 * DISTANCE,
        station=station,
        tide=True,
        push=0.0,
        orbit=orbit,
        host=host,
    )
    shadow = shadow_of("penumbra", MOON.radius, moon.station.distance)
    pushing = push_tables(TABLES if lines else [], SODIUM)
    return conditions_of(forces, losses_of(ionizing=IONIZING), shadow, pushing)


def flown(of, state, tolerance, time):
    """Return (ending, time, state (6,), survival) of a flight for at most `time`."""
    flight, curve = new_flight(), new_curve()
    start_flight(flight, of, tolerance, *map(float, state))
    ending = fly(flight, curve, of, tolerance, time)
    kept = math.exp(-flight[HAZARDS] - flight[HAZARDS + 1])
    return ending, flight[TIME], flight[PLACE : PLACE + 6].copy(), kept


def jacobi(phase, state):
    """Jacobi's constant per mass [m2 s-2] in the frame that turns with the host, about the barycentre.

    Szebehely 1967, Theory of Orbits, section 1.5 (memory): v^2/2 - n^2 rho^2/2 - GM/r - GM_host/q.
    """
    x, y, z, vx, vy, vz = state
    phi = math.radians(phase)
    host = DISTANCE * np.array([math.cos(phi), math.sin(phi), 0.0])
    centre = host * EARTH.gm / (EARTH.gm + MOON.gm)
    rho2 = (x - centre[0]) ** 2 + (y - centre[1]) ** 2
    r, q = math.hypot(x, y, z), np.linalg.norm(np.array([x, y, z]) - host)
    return 0.5 * (vx * vx + vy * vy + vz * vz) - 0.5 * RATE**2 * rho2 - MOON.gm / r - EARTH.gm / q


LAUNCHES = [
    # From the Moon's ground to the Earth's neighbourhood and about; slowly about the Moon; from near the Earth.
    (MOON.radius, 0.0, 0.0, 2300.0, 800.0, 300.0),
    (0.0, 3.0 * MOON.radius, 0.0, 900.0, 0.0, 600.0),
    (0.9 * DISTANCE, -0.1 * DISTANCE, 0.05 * DISTANCE, 500.0, -2500.0, 700.0),
]


@pytest.mark.parametrize("launch", LAUNCHES)
def test_jacobis_constant_is_kept_for_two_periods(launch):
    phase = 0.0
    ending, _, state, _ = flown(dark(phase), launch, 1e-11, 2.0 * PERIOD)
    assert ending == AGED
    # Against the energy that is exchanged, that of the circular motion, since the constant itself is huge.
    change = jacobi(phase, state) - jacobi(phase, launch)
    assert abs(change) < 1e-8 * (RATE * DISTANCE) ** 2
    _, _, wrong, _ = flown(dark(phase, falls=False), launch, 1e-9, 0.2 * PERIOD)
    assert abs(jacobi(phase, wrong) - jacobi(phase, launch)) > 1e-3 * (RATE * DISTANCE) ** 2


def lagrange_points():
    """The five points where a body at rest in the turning frame stays, from the Moon with the Earth on +x [m].

    The collinear ones from the balance of pulls and turning about the barycentre, by bracketing; the others make
    equilateral triangles.
    """
    share = MOON.gm / (EARTH.gm + MOON.gm)

    def balance(x):
        # Units: distance 1, rate 1, both masses 1; the barycentre at 1 - share from the Moon.
        turning = x - (1.0 - share)
        return turning - share * np.sign(x) / x**2 + (1.0 - share) * np.sign(1.0 - x) / (1.0 - x) ** 2

    collinear = [brentq(balance, *ends, xtol=1e-15) for ends in ((0.05, 0.9), (-0.9, -0.05), (1.1, 3.0))]
    points = [np.array([x, 0.0, 0.0]) for x in collinear]
    points += [np.array([0.5, side * math.sqrt(0.75), 0.0]) for side in (1.0, -1.0)]
    return [DISTANCE * point for point in points]


@pytest.mark.parametrize("point", range(5))
def test_what_rests_at_a_lagrange_point_stays(point):
    """L1, L2 and L3 are saddles: there a rounding grows by 2.9 a radian of the period (Szebehely 1967: memory)."""
    place = lagrange_points()[point]
    periods = 0.05 if point < 3 else 1.0
    ending, _, state, _ = flown(dark(0.0), (*place, 0.0, 0.0, 0.0), 1e-11, periods * PERIOD)
    assert ending == AGED
    assert np.linalg.norm(state[:3] - place) < 1e-6 * DISTANCE
    # A point beside it does not stay.
    shifted = place * 1.01
    _, _, state, _ = flown(dark(0.0), (*shifted, 0.0, 0.0, 0.0), 1e-11, periods * PERIOD)
    assert np.linalg.norm(state[:3] - shifted) > 1e-5 * DISTANCE


def two_body(time):
    """Places and velocities, (3,) each, of Moon and Earth about their barycentre, `time` after the Earth was on +x."""
    share = MOON.gm / (EARTH.gm + MOON.gm)
    angle = RATE * time
    way = DISTANCE * np.array([math.cos(angle), math.sin(angle), 0.0])
    speed = RATE * np.array([-way[1], way[0], 0.0])
    return -(1.0 - share) * way, -(1.0 - share) * speed, share * way, share * speed


@pytest.mark.parametrize("launch", LAUNCHES)
def test_flights_agree_with_an_eighth_order_integrator_in_inertial_coordinates(launch):
    """DOP853 (Hairer, Norsett & Wanner 1993), about the barycentre, Moon and Earth going round it."""
    time = 0.4 * PERIOD

    def slopes(t, y):
        moon, _, earth, _ = two_body(t)
        r, q = y[:3] - moon, y[:3] - earth
        pull = -MOON.gm * r / np.linalg.norm(r) ** 3 - EARTH.gm * q / np.linalg.norm(q) ** 3
        return np.concatenate([y[3:], pull])

    moon, speed, _, _ = two_body(0.0)
    r, v = np.array(launch[:3]), np.array(launch[3:])
    begin = np.concatenate([moon + r, speed + v + RATE * np.array([-r[1], r[0], 0.0])])
    end = solve_ivp(slopes, (0.0, time), begin, method="DOP853", rtol=1e-13, atol=1e-7).y[:, -1]
    _, _, state, _ = flown(dark(0.0), launch, 1e-11, time)
    moon, _, _, _ = two_body(time)
    c, s = math.cos(RATE * time), math.sin(RATE * time)
    x, y, z = state[:3]
    found = moon + np.array([c * x - s * y, s * x + c * y, z])
    assert np.linalg.norm(found - end[:3]) < 1e-6 * DISTANCE


def kepler(orbit, time):
    """Return (distance, true anomaly) of two-body motion: Kepler's equation by bracketing."""
    e, m = orbit.eccentricity, orbit.mean_anomaly + orbit.mean_motion * time
    big = brentq(lambda x: x - e * math.sin(x) - m, m - 1.0, m + 1.0, xtol=1e-15, rtol=1e-15)
    f = 2.0 * math.atan2(math.sqrt(1 + e) * math.sin(big / 2), math.sqrt(1 - e) * math.cos(big / 2))
    return orbit.semi_major_axis * (1.0 - e * math.cos(big)), f


def heliocentric(of, time):
    """Places (3,) of Earth and Moon from the Sun along fixed axes, for the conditions of a moon that moves."""
    orbit, host = of.sky.forces.orbit, of.sky.forces.host
    d, f = kepler(orbit, time)
    earth = d * np.array([math.cos(f), math.sin(f), 0.0])
    # The Earth sees the Sun at f + pi; the Moon sees the Earth `phase` from there at first.
    angle = host.true_anomaly + math.pi + host.phase + host.rate * time
    return earth, earth - host.distance * np.array([math.cos(angle), math.sin(angle), 0.0])


def moon_axes(of, time):
    """Return (Moon's place, its velocity, axes (3, 3) of its Sun-fixed frame, their turning) along fixed axes."""
    step = 30.0
    before, _, after = (heliocentric(of, time + k * step)[1] for k in (-1, 0, 1))
    moon = heliocentric(of, time)[1]
    velocity = (after - before) / (2.0 * step)
    x = -moon / np.linalg.norm(moon)
    turning = (moon[0] * velocity[1] - moon[1] * velocity[0]) / (moon @ moon)
    return moon, velocity, np.array([x, [-x[1], x[0], 0.0], [0.0, 0.0, 1.0]]), turning


@pytest.mark.parametrize("phase", [0.0, 90.0, 200.0, 300.0])
def test_a_moon_goes_round_its_host_as_the_host_goes_round_the_sun(phase):
    of = lit(phase, moving=True, true_anomaly=100.0)
    for time in (-40.0 * DAY, 0.0, 3.0 * DAY):
        body = body_on_orbit(of.sky.forces, time)
        moon, velocity, axes, turning = moon_axes(of, time)
        earth, _ = heliocentric(of, time)
        host = axes @ (earth - moon)
        assert body.distance == pytest.approx(np.linalg.norm(moon), rel=1e-12)
        assert body.radial_velocity == pytest.approx(-(axes @ velocity)[0], abs=1e-3)
        assert body.turning == pytest.approx(turning, rel=1e-6)
        assert (body.host.x, body.host.y) == pytest.approx((host[0], host[1]), abs=1e-6 * DISTANCE)
        toward_sun = axes @ (-earth) / np.linalg.norm(earth)
        assert (body.host.sun_x, body.host.sun_y) == pytest.approx(tuple(toward_sun[:2]), abs=1e-12)
        later, earlier = (moon_axes(of, time + step)[3] for step in (600.0, -600.0))
        assert body.turning_growth == pytest.approx((later - earlier) / 1200.0, abs=1e-3 * RATE**2)
    # The stated phase is where the Moon sees the Earth at time 0, and what stands still is what moves at that moment.
    body = body_on_orbit(of.sky.forces, 0.0)
    assert math.degrees(math.atan2(body.host.y, body.host.x)) % 360.0 == pytest.approx(phase, abs=1e-9)
    still = lit(phase, true_anomaly=100.0).sky.forces
    assert still.distance == pytest.approx(body.distance, rel=1e-13)
    assert still.radial_velocity == pytest.approx(body.radial_velocity, abs=1e-8)


def test_phases_are_those_of_the_moon():
    station = Station(ASTRONOMICAL_UNIT, 0.0, 2e-7)
    full, last, new, first = (moon_at_phase(station, DISTANCE, RATE, angle) for angle in (0, 90, 180, 270))
    assert full.station.distance == pytest.approx(ASTRONOMICAL_UNIT + DISTANCE)
    assert new.station.distance == pytest.approx(ASTRONOMICAL_UNIT - DISTANCE)
    # The last quarter runs before the Earth and falls towards the Sun, the first behind it and away, as fast as the
    # phase changes.
    assert last.station.radial_velocity == pytest.approx(-(RATE - 2e-7) * DISTANCE, rel=1e-9)
    assert first.station.radial_velocity == pytest.approx((RATE - 2e-7) * DISTANCE, rel=1e-9)
    # Full moon goes faster about the Sun than the Earth does.
    speeds = [one.station.orbital_rate * one.station.distance for one in (full, new)]
    assert speeds[0] - speeds[1] == pytest.approx(2.0 * RATE * DISTANCE, rel=1e-6)


@pytest.mark.parametrize("phase", [40.0, 170.0])
def test_the_doppler_shift_is_that_of_the_heliocentric_velocity(phase):
    """Of an atom anywhere, in both frames, against its velocity about the Sun by vectors."""
    rng = np.random.default_rng(5)
    for _ in range(5):
        r, v = rng.normal(size=3) * DISTANCE, rng.normal(size=3) * 3e3
        moving = lit(phase, moving=True)
        moon, velocity, axes, turning = moon_axes(moving, 0.0)
        for of, rate in ((lit(phase), RATE), (moving, turning)):
            drag = rate * np.array([-r[1], r[0], 0.0])
            place, speed = moon + axes.T @ r, velocity + axes.T @ (v + drag)
            expected = place @ speed / np.linalg.norm(place)
            found = radial_velocity(body_on_orbit(of.sky.forces, 0.0), *r, *v)
            assert found == pytest.approx(expected, abs=0.01)


def moon_slopes(_time, y, moon, earth, radii, gms, knots2, push2, knots1, push1, rate, moon_velocity):
    """Motion about a Moon that falls freely, along fixed axes; push and loss by the atom's own velocity and light."""
    r, v = y[0:3], y[3:6]
    host = earth - moon
    q = r - host
    atom = moon + r
    far = math.sqrt(np.sum(atom**2))
    d, dh = math.sqrt(np.sum(moon**2)), math.sqrt(np.sum(earth**2))
    light = (ASTRONOMICAL_UNIT / far) ** 2
    for centre, place, distance, radius in ((r, moon, d, radii[0]), (q, earth, dh, radii[1])):
        along = -np.sum(centre * place) / distance
        across = math.sqrt(max(0.0, np.sum(centre**2) - along**2))
        light *= visible_fraction(along, across, 0.0, distance, radius, radii[2])
    receding = np.sum(atom * (moon_velocity + v)) / far
    b = light * (np.interp(receding, knots2, push2) + np.interp(receding, knots1, push1))
    out = np.empty(7)
    out[0:3] = v
    out[3:6] = -gms[0] * r / np.sum(r**2) ** 1.5 + b * atom / far
    out[3:6] -= gms[1] * (q / np.sum(q**2) ** 1.5 + host / np.sum(host**2) ** 1.5)
    out[3:6] -= gms[2] * (atom / far**3 - moon / d**3)
    out[6] = light * rate
    return out


@pytest.mark.parametrize(
    ("phase", "launch"),
    [
        # New moon, the tail towards the Earth; full moon, through the Earth's penumbra and umbra for hours.
        (168.0, (-MOON.radius, 0.0, 0.0, -2500.0, 300.0, 200.0)),
        (1.1, (0.0, MOON.radius, 0.0, 300.0, 2200.0, 900.0)),
    ],
)
def test_flights_from_a_moving_moon_agree_with_an_eighth_order_integrator(phase, launch):
    time = 1.2 * DAY if phase > 90.0 else 0.15 * DAY
    of = lit(phase, moving=True)
    ending, _, state, kept = flown(of, launch, 1e-11, time)
    assert ending == AGED

    def slopes(t, y):
        earth, moon = heliocentric(of, t)
        _, velocity, _, _ = moon_axes(of, t)
        radii, gms = np.array([MOON.radius, EARTH.radius, SUN_RADIUS]), np.array([MOON.gm, EARTH.gm, GM_SUN])
        tables = (KNOTS[0], PUSHES[0], KNOTS[1], PUSHES[1])
        return moon_slopes(t, y, moon, earth, radii, gms, *tables, IONIZING, velocity)

    _, _, axes, turning = moon_axes(of, 0.0)
    r, v = np.array(launch[:3]), np.array(launch[3:])
    begin = [*(axes.T @ r), *(axes.T @ (v + turning * np.array([-r[1], r[0], 0.0]))), 0.0]
    found = solve_ivp(
        slopes,
        (0.0, time),
        begin,
        method="DOP853",
        rtol=1e-11,
        atol=[1e-2] * 3 + [1e-7] * 3 + [1e-11],
        max_step=600.0 if phase > 90.0 else 120.0,
    )
    _, _, axes, _ = moon_axes(of, time)
    assert np.linalg.norm(axes.T @ state[:3] - found.y[:3, -1]) < 1e-4 * MOON.radius
    assert kept == pytest.approx(math.exp(-found.y[6, -1]), abs=1e-7)
    # Full light all the way would have ionised more, by what the eclipse takes.
    if phase < 90.0:
        assert -math.log(kept) < 0.7 * IONIZING * time / of.sky.forces.distance**2 * ASTRONOMICAL_UNIT**2


def test_an_eclipsed_atom_is_neither_pushed_nor_ionised():
    place, velocity = (0.0, 2.0 * MOON.radius, 0.0), (10.0, 20.0, 30.0)
    of, unlit = lit(0.0), lit(0.0, lines=False)
    sky = of.sky
    assert past_host(sky.forces, 1.0, *place) == 0.0
    pushed, losses = rates_beside(sky, of.push_tables, 0, sky.forces, place, velocity)
    alone, _ = rates_beside(unlit.sky, unlit.push_tables, 0, unlit.sky.forces, place, velocity)
    assert pushed == alone
    assert losses == (0.0, 0.0)
    # At a phase of 5 deg it stands in full light: 2 to 50 cm/s2 at 1 au, and the loss of the photo-rate.
    of, unlit = lit(5.0), lit(5.0, lines=False)
    pushed, losses = rates_beside(of.sky, of.push_tables, 0, of.sky.forces, place, velocity)
    alone, _ = rates_beside(unlit.sky, unlit.push_tables, 0, unlit.sky.forces, place, velocity)
    assert 0.02 < alone[0] - pushed[0] < 0.5
    assert losses[0] == pytest.approx(IONIZING * (ASTRONOMICAL_UNIT / of.sky.forces.distance) ** 2, rel=1e-3)


@pytest.mark.filterwarnings("ignore:.*dubious year")
@pytest.mark.parametrize(
    ("night", "greatest"),
    [
        # Greatest eclipse in UT, from the canons (memory).
        (datetime(2022, 11, 8, 11, tzinfo=UTC), datetime(2022, 11, 8, 10, 59, 11, tzinfo=UTC)),
        (datetime(2025, 3, 14, 7, tzinfo=UTC), datetime(2025, 3, 14, 6, 58, 43, tzinfo=UTC)),
    ],
)
def test_eclipses_begin_and_end_when_astropys_sun_earth_and_moon_say(night, greatest):
    """Of the Moon's centre: the discs of Earth and Sun, seen from there, touch from outside and from inside.

    Positions are astropy's, at the same moment. Light needs 1.3 s from Earth to Moon, in which both run on by 38 km, so
    that true contacts come 42 to 47 s earlier: seen beside the published time.
    """

    def seen(minutes):
        moment = night + timedelta(minutes=float(minutes))
        moon = moon_as_seen(moon_sighting(moment))
        host = still_host(EARTH.gm, EARTH.radius, moon, True)
        forces = lit(0.0).sky.forces._replace(host=host)
        return past_host(forces, 1.0, 0.0, 0.0, 0.0)

    def gap(minutes, sign):
        time = Time(night.replace(tzinfo=None), scale="utc") + timedelta(minutes=float(minutes))
        with solar_system_ephemeris.set("builtin"):
            sun, earth, moon = (
                get_body_barycentric(name, time).xyz.to_value("m") for name in ("sun", "earth", "moon")
            )
        to_sun, to_earth = sun - moon, earth - moon
        ds, de = np.linalg.norm(to_sun), np.linalg.norm(to_earth)
        apart = math.atan2(np.linalg.norm(np.cross(to_sun, to_earth)), to_sun @ to_earth)
        return apart - math.asin(EARTH.radius / de) - sign * math.asin(SUN_RADIUS / ds)

    contacts: list[float] = []
    for ends in ((-300.0, 0.0), (0.0, 300.0)):
        for sign, inside in ((1.0, lambda part: part < 1.0), (-1.0, lambda part: part <= 0.0)):
            expected = brentq(gap, *ends, args=(sign,), xtol=1e-4)
            low, high = ends
            rising = inside(seen(high))
            assert inside(seen(low)) != rising
            while high - low > 1e-3:
                middle = 0.5 * (low + high)
                low, high = (low, middle) if inside(seen(middle)) == rising else (middle, high)
            assert abs(0.5 * (low + high) - expected) < 0.1
            contacts.append(0.5 * (low + high))
    middle = night + timedelta(minutes=float(np.mean(contacts)))
    assert abs(middle - greatest) < timedelta(minutes=1)


@pytest.mark.filterwarnings("ignore:.*dubious year")
@pytest.mark.parametrize(
    ("moment", "phase"),
    [
        # Phases of March 2025 in UTC, from an almanac (memory), to a minute: the Moon moves 0.5 deg an hour.
        (datetime(2025, 3, 6, 16, 32, tzinfo=UTC), 270.0),
        (datetime(2025, 3, 14, 6, 55, tzinfo=UTC), 0.0),
        (datetime(2025, 3, 22, 11, 29, tzinfo=UTC), 90.0),
        (datetime(2025, 3, 29, 10, 58, tzinfo=UTC), 180.0),
    ],
)
def test_the_moon_has_its_phase_at_an_epoch(moment, phase):
    moon = moon_as_seen(moon_sighting(moment))
    # A quarter is one in longitude seen from the Earth: 0.15 deg away from the Moon's own right angle.
    assert abs((moon.phase_angle - phase + 180.0) % 360.0 - 180.0) < 0.2
    assert 356e6 < moon.distance < 407e6
    # Orbit inclined by 5.1 deg; from 11.6 to 15.4 deg a day.
    assert abs(moon.host[2]) < 0.0925 * moon.distance
    assert 11.5 < math.degrees(moon.rate * DAY) < 15.5
    on_circle = moon_at_phase(moon.host_station, moon.distance, moon.rate, moon.phase_angle)
    assert moon.station.distance == pytest.approx(on_circle.station.distance, rel=1e-4)
    assert moon.station.radial_velocity == pytest.approx(on_circle.station.radial_velocity, abs=80.0)


def test_no_flight_passes_through_the_host():
    """Straight lines, without gravity and turning: those that pass the host's centre within its radius hit it."""
    of = dark(180.0, gm=0.0, host_gm=0.0, rate=0.0)
    rng = np.random.default_rng(8)
    for miss in (0.0, 0.5, 0.9, 0.999, 0.999999, 1.000001, 1.001, 1.1):
        for speed in (100.0, 3e3, 2e5):
            start = rng.normal(size=3)
            start *= 2.0 * MOON.radius / np.linalg.norm(start)
            way = np.array([-DISTANCE, 0.0, 0.0]) - start
            length = np.linalg.norm(way)
            way /= length
            side = np.cross(way, rng.normal(size=3))
            side /= np.linalg.norm(side)
            tilt = math.asin(miss * EARTH.radius / length)
            velocity = speed * (math.cos(tilt) * way + math.sin(tilt) * side)
            for tolerance in (1e-6, 1e-11):
                ending, time, state, _ = flown(of, (*start, *velocity), tolerance, 1e9)
                assert ending == (STRUCK if miss < 1.0 else CROSSED)
                if miss < 1.0:
                    height = np.linalg.norm(state[:3] - [-DISTANCE, 0.0, 0.0]) - EARTH.radius
                    assert abs(height) < 1e-3
                    chord = length * math.cos(tilt) - EARTH.radius * math.sqrt(1.0 - miss**2)
                    assert time == pytest.approx(chord / speed, rel=1e-5)


def test_steps_end_on_either_side_of_the_host_and_of_its_shadow():
    """In the whole Earth-Moon system no point of a step lies inside the Earth, and each step is short beside it."""
    of = lit(182.0, lines=False)
    host = of.sky.forces.host
    rng, checked, endings = np.random.default_rng(2), 0, set()
    for _ in range(60):
        flight, curve = new_flight(), new_curve()
        up = rng.normal(size=3)
        up /= np.linalg.norm(up)
        aim = np.array([host.x, host.y, 0.0]) / DISTANCE
        up = up if up @ aim > 0.0 else -up
        velocity = 1e5 * aim + 2500.0 * rng.normal(size=3)
        start_flight(flight, of, 1e-6, *(MOON.radius * up), *velocity)
        standing = FLYING
        while standing == FLYING:
            standing = advance(flight, curve, of, 1e-6, 30.0 * DAY)
            for part in (0.3, 0.6, 0.999):
                place = np.array(place_at(curve, part * curve[FLOWN])[:3])
                assert np.linalg.norm(place - [host.x, host.y, 0.0]) > 0.999999 * EARTH.radius
                checked += 1
        assert curve[START] + curve[LENGTH] > 0.0
        endings.add(standing)
    assert checked > 1000
    assert {STRUCK, CROSSED} <= endings <= {STRUCK, CROSSED, LANDED}
