"""Positions on closed-form arcs against an integrator that knows Newton's law alone, and what an arc must keep.

SciPy's DOP853 (Dormand & Prince; Hairer, Norsett & Wanner 1993) integrates x'' = -gm x/r^3 for all launches together
in the regularised time dt = r ds, in which every orbit takes steps of its own size. The integrator never sees the
universal functions; the arc is asked for its position at the time that the integrator reached.
"""

from decimal import Decimal, localcontext
from typing import NamedTuple

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from tracer.kernels.arc import crossing, highest, landing, make_arc, position_at, state_at
from tracer.kernels.universal import anomaly_at_time, time_at

GM, RADIUS = 4902.800e9, 1737.4e3
ESCAPE = np.sqrt(2.0 * GM / RADIUS)
LAUNCHES = 1_000
LAST_BIT = np.finfo(float).eps
STATIONS = 4
"""Each flight is compared at so many evenly spaced universal anomalies, the last one its landing."""


class Launches(NamedTuple):
    """Positions (n, 3) [m] on the ground and velocities (n, 3) [m s-1]."""

    positions: np.ndarray
    velocities: np.ndarray


def launches(count: int, fastest: float, seed: int, slowest: float = 0.05) -> Launches:
    """Return launches anywhere in any upward direction, at `slowest` to `fastest` times the escape speed."""
    rng = np.random.default_rng(seed)
    up = rng.normal(size=(count, 3))
    up /= np.linalg.norm(up, axis=1)[:, None]
    way = rng.normal(size=(count, 3))
    way /= np.linalg.norm(way, axis=1)[:, None]
    way *= np.copysign(1.0, (way * up).sum(axis=1))[:, None]
    speed = ESCAPE * rng.uniform(slowest, fastest, count)
    return Launches(RADIUS * up, speed[:, None] * way)


def arcs_of(some: Launches, gm: float = GM) -> list:
    return [
        make_arc(gm, *x, *v) for x, v in zip(some.positions.tolist(), some.velocities.tolist(), strict=True)
    ]


def integrated(some: Launches, ends: np.ndarray, tolerance: float) -> tuple[np.ndarray, np.ndarray]:
    """Return positions (STATIONS, n, 3) [radii] and times (STATIONS, n) [s] by DOP853 at even anomalies to `ends`."""
    count = len(ends)
    unit_time = np.sqrt(RADIUS**3 / GM)
    scale = (ends * RADIUS / unit_time)[:, None]

    def rate(_s: float, y: np.ndarray) -> np.ndarray:
        x, v = y[: 3 * count].reshape(count, 3), y[3 * count : 6 * count].reshape(count, 3)
        r = np.sqrt((x * x).sum(axis=1))[:, None]
        return np.concatenate([(scale * r * v).ravel(), (-scale * x / r**2).ravel(), (scale * r).ravel()])

    y = np.concatenate(
        [
            (some.positions / RADIUS).ravel(),
            (some.velocities * unit_time / RADIUS).ravel(),
            np.zeros(count),
        ]
    )
    positions, times = [], []
    for station in range(STATIONS):
        span = (station / STATIONS, (station + 1) / STATIONS)
        solution = solve_ivp(rate, span, y, "DOP853", rtol=tolerance, atol=1e-3 * tolerance)
        assert solution.success
        y = solution.y[:, -1]
        positions.append(y[: 3 * count].reshape(count, 3).copy())
        times.append(y[6 * count :] * unit_time)
    return np.array(positions), np.array(times)


def closed_form(arcs: list, ends: np.ndarray, times: np.ndarray) -> np.ndarray:
    """Return positions (STATIONS, n, 3) [radii] of the arcs at `times`."""
    found = np.empty((*times.shape, 3))
    for station, row in enumerate(times):
        for i, (arc, time) in enumerate(zip(arcs, row.tolist(), strict=True)):
            # The integrator's landing may lie a rounding beyond the arc's: leave the bracket some room.
            s = anomaly_at_time(arc.gm, arc.r0, arc.eta, arc.beta, time, 1.001 * ends[i])
            found[station, i] = position_at(arc, s)[2:]
    return found / RADIUS


def test_positions_agree_with_dop853_to_a_billionth_of_the_radius():
    # Up to 0.99 of the escape speed. Beyond it DOP853 itself is good for no more than 3e-9 at the landing, where a
    # relative error in energy of 1e-15 already moves the atom: see the next test.
    some = launches(LAUNCHES, 0.99, seed=41)
    order = np.argsort(np.linalg.norm(some.velocities, axis=1))
    worst_own = worst = worst_of_wrong = 0.0
    for group in np.array_split(order, 20):
        # Orbits alike go together: the integrator's tolerance is one of the root mean square over the group.
        part = Launches(some.positions[group], some.velocities[group])
        arcs = arcs_of(part)
        ends = np.array([landing(arc) for arc in arcs])
        coarse, _ = integrated(part, ends, 3e-13)
        fine, times = integrated(part, ends, 3e-14)
        worst_own = max(worst_own, np.linalg.norm(coarse - fine, axis=2).max())
        worst = max(worst, np.linalg.norm(closed_form(arcs, ends, times) - fine, axis=2).max())
        # The check can fail: gravity wrong by a part in a hundred million shows.
        wrong = closed_form(arcs_of(part, GM * (1.0 + 1e-8)), ends, times)
        worst_of_wrong = max(worst_of_wrong, np.linalg.norm(wrong - fine, axis=2).max())
    # What the integrator itself is worth at a tolerance ten times as large; at the finer one it is better.
    assert worst_own < 1e-8
    assert worst < 1e-9
    assert worst_of_wrong > 1e-7


def test_positions_near_escape_speed_agree_with_forty_digits():
    # Near the end of a flight that almost escapes, the last bit of the launch speed moves the atom by up to 1e-8 radii:
    # no double can say more, so that this much is allowed besides.
    some = launches(60, 0.999, seed=50, slowest=0.99)
    for arc, x, v in zip(arcs_of(some), some.positions.tolist(), some.velocities.tolist(), strict=True):
        end = landing(arc)
        for share in (0.5, 0.9, 1.0):
            time, _, *_ = state_at(arc, share * end)
            s = anomaly_at_time(arc.gm, arc.r0, arc.eta, arc.beta, time, 1.001 * end)
            exact = forty_digit_position(x, v, time)
            last_bit = forty_digit_position(x, [part * (1.0 + LAST_BIT) for part in v], time) - exact
            gap = np.array(position_at(arc, s)[2:]) - exact
            assert np.linalg.norm(gap) < 1e-9 * RADIUS + np.linalg.norm(last_bit)
            if share < 0.95:
                assert np.linalg.norm(gap) < 1e-9 * RADIUS


def forty_digit_position(x: list[float], v: list[float], time: float) -> np.ndarray:
    """Return the position [m] at `time` by Kepler's equation for the difference of eccentric anomalies, in decimals.

    Battin 1999, An Introduction to the Mathematics and Methods of Astrodynamics, section 4.3 (memory).
    """
    with localcontext() as context:
        context.prec = 40
        gm, t = Decimal(GM), Decimal(time)
        at, velocity = [Decimal(part) for part in x], [Decimal(part) for part in v]
        r0 = sum(part * part for part in at).sqrt()
        a = 1 / (2 / r0 - sum(part * part for part in velocity) / gm)
        outward = sum(p * q for p, q in zip(at, velocity, strict=True)) / (gm * a).sqrt()
        inward = 1 - r0 / a
        motion = (gm / a**3).sqrt()
        angle = Decimal(_eccentric_difference(float(motion * t), float(inward), float(outward)))
        for _ in range(4):
            sine, cosine = _sine_cosine(angle)
            excess = angle - inward * sine + outward * (1 - cosine) - motion * t
            angle -= excess / (1 - inward * cosine + outward * sine)
        sine, cosine = _sine_cosine(angle)
        f, g = 1 - a / r0 * (1 - cosine), t - (angle - sine) / motion
        return np.array([float(f * p + g * q) for p, q in zip(at, velocity, strict=True)])


def _eccentric_difference(mean: float, inward: float, outward: float) -> float:
    return brentq(
        lambda e: e - inward * np.sin(e) + outward * (1.0 - np.cos(e)) - mean, 0.0, 2.0 * np.pi + 1e-6
    )


def _sine_cosine(angle: Decimal) -> tuple[Decimal, Decimal]:
    """Return sine and cosine by the power series of a 256th of the angle, doubled eight times."""
    small = angle / 256
    sine, cosine, term = Decimal(0), Decimal(0), Decimal(1)
    for k in range(60):
        if k % 2:
            sine += term if k % 4 == 1 else -term
        else:
            cosine += term if k % 4 == 0 else -term
        term = term * small / (k + 1)
    for _ in range(8):
        sine, cosine = 2 * sine * cosine, cosine * cosine - sine * sine
    return sine, cosine


SPEEDS = pytest.mark.parametrize(
    ("slowest", "fastest", "gm"),
    [(0.05, 0.999, GM), (1.001, 5.0, GM), (0.9999, 1.0001, GM), (0.1, 3.0, 0.0)],
    ids=["bound", "hyperbolic", "near-parabolic", "no gravity"],
)


def ends_of(arcs: list, outer: float) -> np.ndarray:
    ends = []
    for arc in arcs:
        crosses, s = crossing(arc, outer)
        ends.append(s if crosses else landing(arc))
    return np.array(ends)


@SPEEDS
def test_energy_and_angular_momentum_stay_the_same(slowest, fastest, gm):
    some = launches(LAUNCHES, fastest, seed=42, slowest=slowest)
    arcs = arcs_of(some, gm)
    shares = np.random.default_rng(43).random(LAUNCHES)
    states = np.array(
        [state_at(a, s) for a, s in zip(arcs, shares * ends_of(arcs, 50.0 * RADIUS), strict=True)]
    )
    r, x, v = states[:, 1], states[:, 2:5], states[:, 5:8]
    np.testing.assert_allclose(np.linalg.norm(x, axis=1), r, rtol=1e-12)
    speed2 = (some.velocities**2).sum(axis=1)
    energy, first = 0.5 * (v**2).sum(axis=1) - gm / r, 0.5 * speed2 - gm / RADIUS
    # Relative to the kinetic energy at launch plus the depth of the well: near escape the sum itself is next to zero.
    assert np.all(np.abs(energy - first) < 1e-12 * (0.5 * speed2 + gm / RADIUS))
    momentum, at_launch = np.cross(x, v), np.cross(some.positions, some.velocities)
    size = RADIUS * np.sqrt(speed2)
    assert np.all(np.linalg.norm(momentum - at_launch, axis=1) < 1e-12 * size)


@SPEEDS
def test_anomaly_inverts_time(slowest, fastest, gm):
    arcs = arcs_of(launches(LAUNCHES, fastest, seed=44, slowest=slowest), gm)
    ends = ends_of(arcs, 50.0 * RADIUS)
    for arc, end, share in zip(arcs, ends, np.random.default_rng(45).random(LAUNCHES), strict=True):
        time = time_at(arc.gm, arc.r0, arc.eta, arc.beta, share * end)
        s = anomaly_at_time(arc.gm, arc.r0, arc.eta, arc.beta, time, end)
        assert abs(s - share * end) <= 1e-12 * end
        assert abs(time_at(arc.gm, arc.r0, arc.eta, arc.beta, s) - time) <= 1e-12 * time


def test_landing_lies_on_the_sphere():
    arcs = arcs_of(launches(LAUNCHES, 0.999, seed=46, slowest=1e-4))
    ends = [state_at(arc, landing(arc)) for arc in arcs]
    for time, r, *rest in ends:
        assert abs(np.linalg.norm(rest[:3]) / RADIUS - 1.0) < 1e-9
        assert abs(r / RADIUS - 1.0) < 1e-9
        assert time > 0.0
        # Downwards, as fast as it left: the vertical speed only turns its sign.
        assert np.dot(rest[:3], rest[3:]) < 0.0


@SPEEDS
def test_crossing_lies_on_the_outer_sphere(slowest, fastest, gm):
    outer = 7.0 * RADIUS
    crossed = 0
    for arc in arcs_of(launches(LAUNCHES, fastest, seed=47, slowest=slowest), gm):
        crosses, s = crossing(arc, outer)
        crossed += crosses
        if crosses:
            _, r, *rest = state_at(arc, s)
            assert abs(r / outer - 1.0) < 1e-12
            assert np.dot(rest[:3], rest[3:]) > 0.0
        else:
            # It cannot: its apex by orbital elements lies below.
            a = gm / arc.beta
            e = np.sqrt(max(0.0, (1.0 - arc.r0 / a) ** 2 + arc.eta**2 / (gm * a)))
            assert a * (1.0 + e) <= outer * (1.0 + 1e-12)
    assert crossed > (0 if slowest < 0.9 and gm else LAUNCHES - 1)


def test_apex_is_the_highest_point():
    for arc in arcs_of(launches(200, 0.999, seed=48)):
        end = landing(arc)
        top = position_at(arc, highest(arc, end))[1]
        a = GM / arc.beta
        e = np.sqrt((1.0 - arc.r0 / a) ** 2 + arc.eta**2 / (GM * a))
        assert top == pytest.approx(a * (1.0 + e), rel=1e-12)
        assert max(position_at(arc, s)[1] for s in np.linspace(0.0, end, 9)) <= top * (1.0 + 1e-14)


@pytest.mark.parametrize("share", [0.3, 0.999, 1.0, 1.5])
def test_straight_up_stays_on_its_line(share):
    speed = share * ESCAPE
    arc = make_arc(GM, 0.0, 0.6 * RADIUS, 0.8 * RADIUS, 0.0, 0.6 * speed, 0.8 * speed)
    end = ends_of([arc], 30.0 * RADIUS)[0]
    for s in np.linspace(0.0, end, 7):
        _, r, x, y, z, *_ = state_at(arc, s)
        assert x == 0.0
        assert np.hypot(y, z) == pytest.approx(r, rel=1e-12)
        assert y * 0.8 == pytest.approx(z * 0.6, rel=1e-12)


def test_without_gravity_motion_is_straight_and_even():
    some = launches(50, 1.0, seed=49)
    for arc, x, v in zip(arcs_of(some, 0.0), some.positions, some.velocities, strict=True):
        _, s = crossing(arc, 20.0 * RADIUS)
        t, r, *at = position_at(arc, 0.7 * s)
        np.testing.assert_allclose(at, x + v * t, atol=1e-12 * r)
