"""The even numbers from which launches are made: five each, for place, turn about its axis, speed, and direction."""

from functools import cache

import numpy as np
from numpy.typing import NDArray

from tracer.kernels.sobol import BITS, PER_UNIT, sobol_digits, sobol_in_boxes
from tracer.physics.release.laws import Floats

Digits = NDArray[np.uint64]

PLACE, TURN, SPEED, ZENITH, AZIMUTH = range(5)

POLYNOMIALS = ((0, 0, (1,)), (1, 0, (1,)), (2, 1, (1, 3)), (3, 1, (1, 3, 1)), (3, 2, (1, 1, 1)))
"""Degree, coefficients, initial numbers of the first coordinates (Joe & Kuo 2008, SIAM J. Sci. Comput. 30, 2635)."""

DIMENSIONS = len(POLYNOMIALS)


class EvenNumbers:
    """Points even in the unit cube, stratified in all coordinates together.

    A Sobol sequence (Sobol 1967, USSR Comput. Math. Math. Phys. 7, 86), scrambled by random matrices and a random
    shift of its digits (Matousek 1998, J. Complexity 14, 527): each point alone is even in the cube, so that a mean
    has no bias; supplies with other random numbers are independent of each other.

    Parameters
    ----------
    rng : Generator
        Decides the points.
    stratified : bool
        False gives independent points instead, to measure what the strata gain.
    """

    def __init__(self, rng: np.random.Generator, stratified: bool = True) -> None:
        self._rng = rng
        self._stratified = stratified
        self._shift = rng.integers(2**BITS, size=DIMENSIONS, dtype=np.uint64)
        self._directions = _scrambled(direction_numbers(), rng)

    def points(self, numbers: NDArray[np.int64]) -> Floats:
        """Return the points of these `numbers`, (n,) from 0, as (n, DIMENSIONS), each coordinate in [0, 1).

        Best stratified are runs of 2^k points that begin at a multiple of 2^k.
        """
        if not self._stratified:
            return self._rng.random((len(numbers), DIMENSIONS))
        return np.asarray(sobol_digits(self._directions, self._shift, numbers) * PER_UNIT)

    def points_in_boxes(
        self, low: Floats, width: Floats, counts: NDArray[np.int64], first: int, count: int
    ) -> Floats:
        """Return points `first` to `first` + `count` - 1 of boxes of the unit cube, box by box, (count, DIMENSIONS).

        Boxes begin at `low` (m, DIMENSIONS), are `width` (m, DIMENSIONS) wide and have `counts` (m,) points each: those
        whose numbers begin at a multiple of the power of 2 that holds them, behind those of the boxes before. In memory
        a coordinate of all points stands together.
        """
        if self._stratified:
            return np.asarray(
                sobol_in_boxes(self._directions, self._shift, low, width, counts, first, count).T
            )
        box = np.searchsorted(np.cumsum(counts), np.arange(first, first + count), side="right")
        return np.asarray(low[box] + width[box] * self._rng.random((count, DIMENSIONS)))


@cache
def direction_numbers() -> Digits:
    """Return the direction numbers (DIMENSIONS, BITS), scaled by 2^BITS.

    m_i = 2 a_1 m_(i-1) ^ 4 a_2 m_(i-2) ^ ... ^ 2^s m_(i-s) ^ m_(i-s), v_i = m_i 2^-i.
    """
    rows = []
    for degree, coefficients, first in POLYNOMIALS:
        m = list(first) if degree else [1] * BITS
        while len(m) < BITS:
            new = m[-degree] ^ (m[-degree] << degree)
            for k in range(1, degree):
                new ^= ((coefficients >> (degree - 1 - k)) & 1) * (m[-k] << k)
            m.append(new)
        rows.append([number << (BITS - 1 - i) for i, number in enumerate(m)])
    return np.array(rows, dtype=np.uint64)


def _scrambled(directions: Digits, rng: np.random.Generator) -> Digits:
    """Return direction numbers whose every digit has a random sum of the digits before it added."""
    places = np.arange(BITS, dtype=np.uint64)
    own = np.uint64(1) << places
    # Digits before one's own are the higher ones.
    before = rng.integers(2**BITS, size=(DIMENSIONS, 1, BITS), dtype=np.uint64) & ~(2 * own - np.uint64(1))
    parity = np.bitwise_count(directions[:, :, np.newaxis] & (before | own)).astype(np.uint64) & np.uint64(1)
    return np.asarray(np.bitwise_or.reduce(parity << places, axis=2))
