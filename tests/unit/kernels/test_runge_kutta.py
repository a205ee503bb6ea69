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


SYMMETRIES = (24, 2, 2, 1, 2, 6, 1, 2, 1)
"""Of the trees of five nodes: how many orders of their branches are the same."""

DORMAND_PRINCE = (
    (),
    (1 / 5,),
    (3 / 40, 9 / 40),
    (44 / 45, -56 / 15, 32 / 9),
    (19372 / 6561, -25360 / 2187, 64448 / 6561, -212 / 729),
    (9017 / 3168, -355 / 33, 46732 / 5247, 49 / 176, -5103 / 18656),
    (35 / 384, 0.0, 500 / 1113, 125 / 192, -2187 / 6784, 11 / 84),
)
"""Dormand & Prince (1980), J. Comput. Appl. Math. 6, 19, RK5(4)7M."""


def best_quartic(a, error, quartic):
    """Return the quartic row, of all that keep the fourth order, with the least error of fifth order over the step.

    That is the squared error of all trees' terms over their symmetry, integrated; `quartic` plus any part of the
    `error` row has fourth order.
    """
    c = a.sum(axis=1)
    weights = (
        *(c**4, c**2 * (a @ c), c * (a @ c**2), c * (a @ (a @ c)), (a @ c) ** 2, a @ c**3),
        *(a @ (c * (a @ c)), a @ (a @ c**2), a @ (a @ (a @ c))),
    )
    parts, shares = np.polynomial.legendre.leggauss(12)
    parts = 0.5 * (parts + 1.0)
    rest = 1.0 - parts
    b = a[6]
    bend, end = UNITS[0] - b, b - UNITS[6]

    def size(more):
        total = 0.0
        for stages, (_, density, _), symmetry in zip(weights, TREES[8:], SYMMETRIES, strict=True):
            inner = (end - bend) @ stages + rest * ((quartic + more * error) @ stages)
            value = parts * (b @ stages + rest * (bend @ stages + parts * inner))
            total += np.sum(shares * ((value - parts**5 / density) / symmetry) ** 2)
        return total

    # A parabola: its vertex from three values.
    low, middle, high = size(-1.0), size(0.0), size(1.0)
    return quartic + 0.5 * (low - high) / (low - 2.0 * middle + high) * error


def test_dense_output_has_the_least_error_of_fifth_order():
    np.testing.assert_allclose(best_quartic(A, ERROR, QUARTIC), QUARTIC, rtol=1e-9, atol=1e-12)


def test_the_same_rule_gives_the_dense_output_that_is_usual_with_another_pair():
    # Hairer, Norsett & Wanner (1993), section II.6, the program DOPRI5: its row of d.
    a = np.array([[*row, *[0.0] * (7 - len(row))] for row in DORMAND_PRINCE])
    error = np.array([71 / 57600, 0.0, -71 / 16695, 71 / 1920, -17253 / 339200, 22 / 525, -1 / 40])
    usual = np.array(
        [
            -12715105075 / 11282082432,
            0.0,
            87487479700 / 32700410799,
            -10690763975 / 1880347072,
            701980252875 / 199316789632,
            -1453857185 / 822651844,
            69997945 / 29380423,
        ]
    )
    np.testing.assert_allclose(best_quartic(a, error, usual + 0.3 * error), usual, rtol=1e-8, atol=1e-12)
