"""The host's formulas: compiled as in Python, and how far a step may go beside its shadow."""

import numba
import numpy as np
import pytest

from tracer.catalogue.load import hosts
from tracer.kernels.compiling import OPTIONS
from tracer.kernels.host import (
    CLEAR,
    DARK,
    PARTIAL,
    host_height,
    host_neared,
    nearest,
    past_host,
    shade_and_nearness,
    sun_past,
    with_host_pull,
    with_slip,
)
from tracer.kernels.integrated_flight import longest_beside_host
from tracer.kernels.orbit import body_on_orbit, stated_body
from tracer.kernels.two_body import orbit_state, true_anomaly
from tracer.physics.host import moon_at_phase, moving_host, still_host
from tracer.physics.orbit import Station, orbit_through
from tracer.physics.sunlight import forces_of

JUPITER = hosts()["Jupiter"]
STATION = Station(7.6e11, 300.0, 1.7e-8)
DISTANCE, RATE, RADIUS = 4.2e8, 4.1e-5, 1.8e6
RNG = np.random.default_rng(12)


def forces(kind, phase=3.0):
    moon = moon_at_phase(STATION, DISTANCE, RATE, phase)
    orbit = orbit_through(STATION) if kind == "moving" else None
    host = None
    if kind == "still":
        host = still_host(JUPITER.gm, JUPITER.radius, moon, True)
    if kind == "moving":
        host = moving_host(JUPITER.gm, JUPITER.radius, moon, orbit, True)
    return forces_of(
        gm=6e12, radius=RADIUS, outer_radius=1e9, station=STATION, tide=True, push=0.0, orbit=orbit, host=host
    )


def formulas(body, place, end):
    x, y, z, _, _, _ = place
    return (
        with_host_pull(body, 0.1, 0.2, 0.3, x, y, z),
        with_slip(body, 500.0, 1e-3),
        past_host(body, 0.7, x, y, z),
        host_height(body, place),
        host_neared(body, body, place, end),
        nearest(body, 1.8e6, 1e-8, x, y, z),
        longest_beside_host(body, place, 1e6, (0.1, 0.2, 0.3), 1e5),
    )


@pytest.mark.parametrize("kind", ["none", "still", "moving"])
def test_compiled_formulas_are_those_in_python(kind):
    of = forces(kind)
    compiled = numba.njit(**OPTIONS)(formulas)
    stated = numba.njit(**OPTIONS)(lambda forces: stated_body(forces))
    body = stated_body(of)
    for plain, made in zip(body, stated(of), strict=True):
        assert plain is None or np.allclose(plain, made, rtol=1e-12, atol=0.0)
    for place in RNG.normal(size=(4, 6)) * [3e8, 3e8, 3e8, 1e3, 1e3, 1e3]:
        end = (*(place[:3] + 1e3 * place[3:]), *place[3:])
        for plain, made in zip(
            formulas(body, tuple(place), end), compiled(body, tuple(place), end), strict=True
        ):
            assert plain == pytest.approx(made, rel=1e-12)


def test_a_step_stays_in_the_light_that_its_shade_says():
    """From places about the shadow of Jupiter, to all sides as far as the step may go."""
    host = forces("still").host
    toward_sun = np.array([host.sun_x, host.sun_y, host.sun_z])
    centre = np.array([host.x, host.y, host.z])
    side = np.array([-toward_sun[1], toward_sun[0], 0.0])
    shades = set()
    for _ in range(3000):
        along = -DISTANCE * 3.0 * RNG.random()
        off = JUPITER.radius * (1.0 + 0.3 * RNG.normal())
        place = centre + along * toward_sun + off * side
        shade, per_way = shade_and_nearness(host, *map(float, place))
        shades.add(shade)
        if shade == PARTIAL:
            continue
        way = RNG.normal(size=3)
        end = place + way / np.linalg.norm(way) / per_way
        assert sun_past(host, *map(float, end)) == (1.0 if shade == CLEAR else 0.0)
    assert shades == {CLEAR, PARTIAL, DARK}


def test_a_host_that_casts_no_shadow_covers_nothing():
    host = forces("still", 0.0).host
    assert sun_past(host, 0.0, 0.0, 0.0) == 0.0
    bare = host._replace(casts=0.0)
    assert sun_past(bare, 0.0, 0.0, 0.0) == 1.0
    shade, per_way = shade_and_nearness(bare, 0.0, 0.0, 0.0)
    assert (shade, per_way) == (CLEAR, pytest.approx(1.0 / DISTANCE))


@pytest.mark.parametrize("time", [-3e8, 0.0, 1e7])
def test_the_true_anomaly_belongs_to_the_distance(time):
    orbit = orbit_through(STATION)
    f, (distance, velocity) = true_anomaly(orbit, time), orbit_state(orbit, time)
    parameter = orbit.angular_momentum**2 / orbit.gm
    assert distance == pytest.approx(parameter / (1.0 + orbit.eccentricity * np.cos(f)), rel=1e-12)
    assert velocity == pytest.approx(
        orbit.gm / orbit.angular_momentum * orbit.eccentricity * np.sin(f), rel=1e-9
    )
    assert body_on_orbit(forces("moving"), time).host.sun_distance == pytest.approx(distance, rel=1e-14)
