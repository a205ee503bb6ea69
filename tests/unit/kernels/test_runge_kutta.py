"""The pair's order conditions, and its rows against its tableau.

Conditions: Hairer, Norsett & Wanner (1993), Solving Ordinary Differential Equations I, section II.2, table 2.2.
"""

import numpy as np
import pytest

from tracer.kernels.runge_kutta import (
    NODES,
    TABLEAU,
    error_row,
    fifth_row,
    fourth_row,
    quartic_row,
    second_row,
    sixth_row,
    solution_row,
    third_row,
)

C = np.array(NODES)
A = np.zeros((7, 7))
A[1:, :6] = TABLEAU
UNITS = np.eye(7)
"""Slopes of which one is 1 and the others are 0: with them a row gives its coefficients."""

PAIR = (0, 2, 3, 4, 5, 6)
"""Stages from which error and dense output are taken."""

B = A[6]
ERROR = np.array([error_row.py_func(1.0, *(unit[k] for k in PAIR)) for unit in UNITS])
QUARTIC = np.array([quartic_row.py_func(1.0, *(unit[k] for k in PAIR)) for unit in UNITS])

TREES = (
    (1, 1, np.ones(7)),
    (2, 2, C),
    (3, 3, C**2),
    (3, 6, A @ C),
    (4, 4, C**3),
    (4, 8, C * (A @ C)),
    (4, 12, A @ C**2),
    (4, 24, A @ (A @ C)),
    (5, 5, C**4),
    (5, 10, C**2 * (A @ C)),
    (5, 15, C * (A @ C**2)),
    (5, 30, C * (A @ (A @ C))),
    (5, 20, (A @ C) ** 2),
    (5, 20, A @ C**3),
    (5, 40, A @ (C * (A @ C))),
    (5, 60, A @ (A @ C**2)),
    (5, 120, A @ (A @ (A @ C))),
)
"""Order and density of each rooted tree of up to five nodes, and the stages' elementary weights."""


@pytest.mark.parametrize(
    ("row", "stage", "slopes"),
    [
        (second_row, 1, (0,)),
        (third_row, 2, (1,)),
        (fourth_row, 3, (0, 1, 2)),
        (fifth_row, 4, (0, 3)),
        (sixth_row, 5, (0, 1, 2, 3, 4)),
    ],
)
def test_rows_are_those_of_the_tableau(row, stage, slopes):
    found = [row.py_func(0.0, 1.0, *(unit[k] for k in slopes)) for unit in UNITS]
    np.testing.assert_allclose(found, A[stage], rtol=1e-15)
    # A longer step from elsewhere.
    assert row.py_func(3.0, 2.0, *np.ones(len(slopes))) == pytest.approx(3.0 + 2.0 * C[stage], rel=1e-15)


def test_the_solution_is_the_last_stage():
    found = [solution_row.py_func(1.0, *(unit[k] for k in PAIR[:-1])) for unit in UNITS]
    np.testing.assert_allclose(found, B, rtol=1e-15)


@pytest.mark.parametrize(("order", "density", "weights"), TREES)
def test_solution_has_fifth_and_error_fourth_order(order, density, weights):
    assert B @ weights == pytest.approx(1.0 / density, rel=1e-14)
    if order < 5:
        assert ERROR @ weights == pytest.approx(0.0, abs=1e-15)


def test_the_error_sees_every_tree_of_fifth_order():
    assert max(abs(ERROR @ weights) for order, _, weights in TREES if order == 5) > 1e-4


@pytest.mark.parametrize("part", [0.1, 0.35, 0.5, 0.8, 1.0])
def test_dense_output_has_fourth_order(part):
    rest = 1.0 - part
    first, last = UNITS[0], UNITS[6]
    # The polynomial of `dense_output`, as weights of the slopes.
    bend, end = first - B, B - last
    weights = part * (B + rest * (bend + part * (end - bend + rest * QUARTIC)))
    for order, density, stages in TREES[:8]:
        assert weights @ stages == pytest.approx(part**order / density, rel=1e-13)


def test_dense_output_has_the_least_error_of_fifth_order():
    # Squared error of all trees' terms over their symmetry, over the step; what may be added without loss of order is
    # the error row. By this the pair of Dormand & Prince has the dense output that is usually taken with it.
    symmetries = (24, 2, 2, 1, 2, 6, 1, 2, 1)
    parts, shares = np.polynomial.legendre.leggauss(12)
    parts = 0.5 * (parts + 1.0)
    rest = 1.0 - parts
    bend, end = UNITS[0] - B, B - UNITS[6]

    def error(more):
        quartic = QUARTIC + more * ERROR
        total = 0.0
        for (_, density, stages), symmetry in zip(TREES[8:], symmetries, strict=True):
            outer = bend @ stages + parts * ((end - bend) @ stages + rest * (quartic @ stages))
            value = parts * (B @ stages + rest * outer)
            total += np.sum(shares * ((value - parts**5 / density) / symmetry) ** 2)
        return total

    # A parabola: its vertex from three values.
    low, middle, high = error(-1.0), error(0.0), error(1.0)
    assert 0.5 * (low - high) / (low - 2.0 * middle + high) == pytest.approx(0.0, abs=1e-9)
