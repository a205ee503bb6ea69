"""Compiled kernels give what their Python source gives."""

import numpy as np
import pytest

from tracer.kernels import (
    adsorption,
    arc,
    arc_flight,
    bounce,
    cells,
    scoring,
    sticking,
    temperature,
    universal,
)

RNG = np.random.default_rng(71)
GM, RADIUS = 4902.8e9, 1737.4e3


def assert_same(kernel, *arguments) -> None:
    np.testing.assert_allclose(kernel(*arguments), kernel.py_func(*arguments), rtol=1e-13, atol=0.0)


@pytest.mark.parametrize("share", [0.3, 0.9999, 1.0, 1.7])
def test_universal_variables(share):
    speed = share * np.sqrt(2.0 * GM / RADIUS)
    beta, eta = 2.0 * GM / RADIUS - speed**2, 0.7 * RADIUS * speed
    end = 30.0 * RADIUS / speed / RADIUS
    for s in (1e-3 * end, 0.1 * end, 0.5 * end):
        assert_same(universal.g_functions, beta, s)
        assert_same(universal.time_at, GM, RADIUS, eta, beta, s)
        time = universal.time_at(GM, RADIUS, eta, beta, s)
        assert_same(universal.anomaly_at_time, GM, RADIUS, eta, beta, time, end)
    assert_same(universal.anomaly_from_half_tangent, beta, 0.1 * eta, 10.0 * GM)


@pytest.mark.parametrize("speed", [300.0, 1500.0, 2370.0, 4000.0])
def test_arcs(speed):
    for _ in range(5):
        up = RNG.normal(size=3)
        up /= np.linalg.norm(up)
        way = up + 0.5 * RNG.normal(size=3)
        state = (*(RADIUS * up), *(speed * np.sign(way @ up) * way / np.linalg.norm(way)))
        made = arc.make_arc(GM, *state)
        assert_same(arc.make_arc, GM, *state)
        assert_same(arc.crossing, made, 20.0 * RADIUS)
        crosses, s = arc.crossing(made, 20.0 * RADIUS)
        if not crosses:
            assert_same(arc.landing, made)
            s = arc.landing(made)
        assert_same(arc.highest, made, s)
        # One part of a vector may pass through zero: compare against its length.
        compiled, plain = arc.state_at(made, 0.4 * s), arc.state_at.py_func(made, 0.4 * s)
        scale = np.array([compiled[0], *[compiled[1]] * 4, *[speed] * 3])
        np.testing.assert_allclose(np.array(compiled) / scale, np.array(plain) / scale, rtol=0.0, atol=1e-13)


def test_turned_axes():
    for angle in (0.0, 0.3, -2.0):
        assert_same(arc_flight.turned, 3.0, -1.0, angle)


def grid() -> cells.Cells:
    altitudes = np.concatenate(([0.0], np.geomspace(1e4, 5e6, 12)))
    return cells.make_cells(
        RADIUS, RADIUS + altitudes, 1e4, 11.0 / np.log(5e6 / 1e4), latitude_cells=7, local_time_cells=9
    )


def test_cells():
    some = grid()
    for _ in range(200):
        x, y, z = RNG.normal(size=3) * RADIUS
        r = RADIUS * (1.0 + 4.0 * RNG.random() ** 4)
        sine = z / np.sqrt(x * x + y * y + z * z)
        assert cells.altitude_cell(some, r) == cells.altitude_cell.py_func(some, r)
        assert cells.latitude_cell(some, sine) == cells.latitude_cell.py_func(some, sine)
        assert cells.local_time_cell(some, x, y) == cells.local_time_cell.py_func(some, x, y)


def test_ground_temperature_and_survival():
    law = temperature.SurfaceTemperature(temperature.QUARTER_POWER, 600.0, 110.0)
    for x in (-0.5, 0.0, 0.2, 1.0):
        assert_same(temperature.temperature, law, x, 0.0, np.sqrt(1.0 - x * x))
    for hazard in (0.0, 1e-9, 1e-2):
        assert_same(scoring.mean_survival_time, hazard, 300.0)


def test_rebounds_draw_the_same_random_numbers():
    surface = bounce.Surface(
        temperature.SurfaceTemperature(temperature.UNIFORM, 300.0, 300.0),
        sticking.Sticking(0.0, 0.0, np.inf),
        0.5,
        4000.0,
        0.0,
    )
    compiled, plain = np.random.default_rng(5), np.random.default_rng(5)
    for _ in range(20):
        one = bounce.rebound(compiled, surface, 0.6, 0.0, 0.8, 1e6)
        other = bounce.rebound.py_func(plain, surface, 0.6, 0.0, 0.8, 1e6)
        np.testing.assert_allclose(one, other, rtol=1e-12)


def test_residence_and_what_it_leaves():
    law = temperature.SurfaceTemperature(temperature.QUARTER_POWER, 390.0, 95.0)
    held = adsorption.Adsorption(True, 3400.0, np.log(1e13), 0.0, np.zeros(2), False)
    for angle in (1.0, 2.0, -2.0, -1.6):
        place = (float(np.cos(angle)), float(np.sin(angle)), 0.0)
        for spin in (2.5e-6, -2.5e-6, 0.0):
            assert_same(adsorption.residence, law, held, spin, place, 1.3, 1e8)
            assert_same(adsorption.photon_residence, 1e-6, spin, place, 1.3, 1e8)
    compiled, plain = np.zeros(7), np.zeros(7)
    adsorption.spread_along(compiled, -1.0, 9.0, 3.0)
    adsorption.spread_along.py_func(plain, -1.0, 9.0, 3.0)
    np.testing.assert_allclose(compiled, plain, rtol=1e-13)
