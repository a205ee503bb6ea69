"""Rough functions keep to the errors that they state, and cells found by them are those of the exact functions."""

import math

import numpy as np
import pytest

from tracer.kernels.cells import altitude_cell, latitude_cell, local_time_cell, make_cells
from tracer.kernels.first_guess import (
    ANGLE_ERROR,
    ARCSINE_ERROR,
    LOGARITHM_ERROR,
    rough_angle,
    rough_arcsine,
    rough_logarithm,
)
from tracer.kernels.step_control import inverse_tenth_root

RADIUS = 2.4e6


def test_rough_angle_is_within_its_error_all_round():
    angles = np.linspace(-math.pi, math.pi, 20_001)[1:]
    for angle in angles:
        x, y = 3.0 * math.cos(angle), 3.0 * math.sin(angle)
        assert abs(rough_angle(x, y) - math.atan2(y, x)) < ANGLE_ERROR


def test_rough_arcsine_is_within_its_error_from_pole_to_pole():
    for sine in np.concatenate([np.linspace(-1.0, 1.0, 20_001), 1.0 - np.geomspace(1e-15, 1e-3, 50)]):
        assert abs(rough_arcsine(sine) - math.asin(sine)) < ARCSINE_ERROR


def test_rough_logarithm_is_within_its_error_over_all_magnitudes():
    for value in np.concatenate([np.geomspace(1e-12, 1e12, 20_001), np.linspace(1.0, 2.0, 2_001)]):
        assert abs(rough_logarithm(value) - math.log(value)) < LOGARITHM_ERROR


def test_inverse_tenth_root_is_right_to_half_a_per_cent():
    for value in np.geomspace(1e-12, 1e30, 20_001):
        assert inverse_tenth_root(value) == pytest.approx(value**-0.1, rel=5e-3)


def near(part: float, number: int, spread: float = 1e-14, wraps: bool = True) -> set[int]:
    """Return the cells, of `number`, that hold what lies within `spread` of `part` of the whole."""
    cells = {math.floor((part + change) * number) for change in (-spread, 0.0, spread)}
    return {cell % number for cell in cells} if wraps else {min(number - 1, max(0, cell)) for cell in cells}


@pytest.mark.parametrize("number", [1, 7, 48, 4096])
def test_cells_are_those_of_the_exact_functions(number):
    altitudes = np.concatenate(([0.0], np.geomspace(1e4, 2e7, number)))
    per_log = (number - 1) / math.log(altitudes[-1] / altitudes[1]) if number > 1 else 0.0
    cells = make_cells(RADIUS, RADIUS + altitudes, 1e4, per_log, number, number)
    rng = np.random.default_rng(5)
    # Half of the places at random, half on an edge or a hair off it.
    hair = 1.0 + rng.choice([-1e-9, -1e-15, 0.0, 1e-15, 1e-9], 4_000)
    turns = np.concatenate([rng.random(4_000), rng.integers(0, number, 4_000) / number * hair])
    for turn in turns:
        angle = 2.0 * math.pi * (turn - 0.5)
        x, y = 3.0 * math.cos(angle), 3.0 * math.sin(angle)
        # A hair off an edge rounding decides, in the exact functions too.
        assert local_time_cell(cells, x, y) in near(0.5 + math.atan2(y, x) / (2.0 * math.pi), number)
        sine = math.sin(math.pi * (turn - 0.5))
        # Towards the poles sines lie closer than their angles.
        spread = 1e-15 / max(1e-8, math.sqrt(1.0 - sine * sine))
        row = latitude_cell(cells, sine)
        assert row in near(math.asin(sine) / math.pi + 0.5, number, max(1e-14, spread), wraps=False)
    edges = RADIUS + altitudes
    for r in np.concatenate(
        [rng.uniform(RADIUS, RADIUS + 2e7, 4_000), edges[rng.integers(0, number, 4_000)]]
    ):
        layer = int(np.searchsorted(edges, r, side="right")) - 1
        assert altitude_cell(cells, r) == (layer if layer < number else -1)


def test_a_place_on_the_axis_has_a_cell():
    cells = make_cells(RADIUS, RADIUS + np.array([0.0, 1e4]), 1e4, 0.0, 36, 48)
    assert latitude_cell(cells, 1.0) == 35
    assert latitude_cell(cells, -1.0) == 0
    assert local_time_cell(cells, 0.0, 0.0) == 24


def test_what_is_not_a_number_has_a_cell_inside_the_grid():
    cells = make_cells(RADIUS, RADIUS + np.array([0.0, 1e4, 1e5]), 1e4, 1.0 / math.log(10.0), 36, 48)
    assert 0 <= altitude_cell(cells, math.nan) < 2
    assert 0 <= latitude_cell(cells, math.nan) < 36
    assert 0 <= local_time_cell(cells, math.nan, 1.0) < 48
