"""Look-up in tables with even steps."""

import numpy as np
import pytest

from tracer.kernels.lines import beyond_tables, flat_tables, line_value, sum_of_lines

FIRST = np.array([1.0, 4.0, 2.0])
TABLES = flat_tables(
    [-1000.0, 0.0, 500.0], [500.0, 1.0, 100.0], [FIRST, np.array([7.0]), np.array([0.0, 1.0])]
)


def test_knots_are_met_exactly_and_between_them_all_is_linear():
    for velocity, value in zip((-1000.0, -500.0, 0.0), FIRST, strict=True):
        assert line_value(TABLES, 0, velocity) == value
    assert line_value(TABLES, 0, -600.0) == pytest.approx(3.4, rel=1e-14)
    assert line_value(TABLES, 2, 525.0) == pytest.approx(0.25, rel=1e-14)


def test_end_values_are_held_beyond_a_table():
    assert line_value(TABLES, 0, -1e9) == 1.0
    assert line_value(TABLES, 0, 1e9) == 2.0
    assert line_value(TABLES, 1, 12345.0) == 7.0


def test_lines_add_up():
    assert sum_of_lines(TABLES, 525.0) == pytest.approx(2.0 + 7.0 + 0.25, rel=1e-14)
    assert sum_of_lines(flat_tables([], [], []), 0.0) == 0.0


def test_beyond_is_beyond_any_table_but_those_of_one_value():
    assert not beyond_tables(flat_tables([0.0], [1.0], [np.array([7.0])]), 1e5)
    assert beyond_tables(TABLES, 700.0)
    assert not beyond_tables(flat_tables([-1000.0], [500.0], [FIRST]), -1000.0)


def test_velocity_that_is_not_a_number_stays_inside_the_table():
    assert line_value(TABLES, 0, np.nan) == FIRST[0]
