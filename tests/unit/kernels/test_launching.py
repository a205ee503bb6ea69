"""Places and velocities of launches against their formulas written down plainly."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tracer.kernels.angles import sine_and_cosine
from tracer.kernels.compiling import kernel
from tracer.kernels.intervals import find_intervals
from tracer.kernels.launching import LEAST_SINE, velocities
from tracer.kernels.places import places_around, places_in_cells
from tracer.kernels.trapezoids import trapezoid_quantiles

RNG = np.random.default_rng(29)
COUNT = 3001


@kernel
def angles(values, sines, cosines):
    for i in range(values.shape[0]):
        sines[i], cosines[i] = sine_and_cosine(values[i])


@kernel
def intervals(edges, count, values, begins):
    find_intervals(edges, count, values, begins)


def test_sines_and_cosines_are_those_of_the_mathematical_library():
    values = np.concatenate((RNG.uniform(-20.0, 20.0, COUNT), 0.25 * np.pi * np.arange(-16, 17)))
    sines, cosines = np.empty_like(values), np.empty_like(values)
    angles(values, sines, cosines)
    np.testing.assert_allclose(sines, np.sin(values), rtol=0.0, atol=3e-16)
    np.testing.assert_allclose(cosines, np.cos(values), rtol=0.0, atol=3e-16)


def unit_vectors(count: int) -> np.ndarray:
    found = RNG.normal(size=(count, 3))
    return found / np.linalg.norm(found, axis=1)[:, np.newaxis]


def test_velocities_have_their_speed_zenith_angle_and_azimuth_from_sunward():
    ups = unit_vectors(COUNT)
    ups[:3] = [[1.0, 0.0, 0.0], [-1.0, 0.0, 0.0], [np.sqrt(1.0 - 1e-14), 1e-7, 0.0]]
    speeds, cosines = RNG.uniform(1.0, 5e3, COUNT), RNG.uniform(1e-3, 1.0, COUNT)
    azimuths = RNG.uniform(0.0, 2.0 * np.pi, COUNT)
    found = velocities(ups, speeds, cosines, azimuths)
    np.testing.assert_allclose(np.linalg.norm(found, axis=1), speeds, rtol=1e-14)
    np.testing.assert_allclose(np.sum(found * ups, axis=1) / speeds, cosines, rtol=0.0, atol=1e-15)
    # Sunward along the ground is what is left of +x without its part along the vertical.
    sun = np.array([1.0, 0.0, 0.0]) - ups[:, :1] * ups
    sun = sun[3:] / np.linalg.norm(sun[3:], axis=1)[:, np.newaxis]
    level = (found - np.sum(found * ups, axis=1)[:, np.newaxis] * ups)[3:]
    level /= (speeds[3:] * np.sqrt(1.0 - cosines[3:] ** 2))[:, np.newaxis]
    np.testing.assert_allclose(np.sum(level * sun, axis=1), np.cos(azimuths[3:]), rtol=0.0, atol=1e-12)
    across = np.sum(level * np.cross(ups[3:], sun), axis=1)
    np.testing.assert_allclose(across, np.sin(azimuths[3:]), rtol=0.0, atol=1e-12)


def test_azimuths_near_the_subsolar_point_are_even_about_the_vertical():
    # Where nothing is sunward, four azimuths a quarter apart still cancel but for their part along the vertical.
    ups = np.repeat([[1.0, 0.3 * LEAST_SINE, -0.2 * LEAST_SINE]], 4, axis=0)
    found = velocities(ups, np.ones(4), np.full(4, 0.6), 0.5 * np.pi * np.arange(4.0))
    np.testing.assert_allclose(found.mean(axis=0), 0.6 * ups[0], rtol=0.0, atol=1e-12)
    np.testing.assert_allclose(
        found @ found.T,
        0.36 + 0.64 * np.array([[1, 0, -1, 0], [0, 1, 0, -1], [-1, 0, 1, 0], [0, -1, 0, 1]]),
        rtol=0.0,
        atol=1e-12,
    )


def test_places_around_an_axis_are_the_formula():
    axis = unit_vectors(1)[0]
    first = np.cross(axis, [0.0, 0.0, 1.0])
    first /= np.linalg.norm(first)
    axes = np.stack([axis, first, np.cross(axis, first)])
    cosines, turns = RNG.uniform(-1.0, 1.0, COUNT), RNG.random(COUNT)
    sines = np.sqrt(1.0 - cosines**2)
    angle = 2.0 * np.pi * turns
    parts = np.column_stack([cosines, sines * np.cos(angle), sines * np.sin(angle)])
    np.testing.assert_allclose(places_around(axes, cosines, turns), parts @ axes, rtol=0.0, atol=1e-15)


def test_places_in_cells_lie_in_the_cells_that_have_the_flux():
    # Two of six cells: the middle row's first, a quarter of all, and the last row's second.
    sines, hours = np.array([-1.0, -0.5, 0.2, 1.0]), np.array([0.0, 6.0, 24.0])
    rows = np.array([0.0, 0.0, 0.25, 1.0])
    columns = np.array([[0.0, 0.0, 0.0], [0.0, 1.0, 1.0], [0.0, 0.0, 1.0]])
    u = RNG.random((COUNT, 2))
    found = places_in_cells(sines, hours, rows, columns, *np.ascontiguousarray(u.T))
    hour = (12.0 + np.arctan2(found[:, 1], found[:, 0]) * 12.0 / np.pi) % 24.0
    middle = u[:, 0] < 0.25
    np.testing.assert_allclose(found[middle, 2], -0.5 + 0.7 * u[middle, 0] / 0.25, atol=1e-14)
    np.testing.assert_allclose(found[~middle, 2], 0.2 + 0.8 * (u[~middle, 0] - 0.25) / 0.75, atol=1e-14)
    np.testing.assert_allclose(hour[middle], 6.0 * u[middle, 1], atol=1e-12)
    np.testing.assert_allclose(hour[~middle], 6.0 + 18.0 * u[~middle, 1], atol=1e-12)


# The first example may have to compile.
@settings(deadline=None)
@given(st.lists(st.integers(0, 12), min_size=2, max_size=40), st.lists(st.floats(-1.0, 14.0), min_size=1))
def test_intervals_are_those_of_a_sorted_search(edges, values):
    rising, wanted = np.sort(np.array(edges, dtype=float)), np.array(values)
    begins = np.zeros(len(wanted), np.int64)
    intervals(rising, len(rising) - 1, wanted, begins)
    expected = np.clip(np.searchsorted(rising, wanted, side="right") - 1, 0, len(rising) - 2)
    np.testing.assert_array_equal(begins, expected)


@pytest.mark.parametrize("pdf", [[0.0, 2.0, 0.0, 0.0, 1.0, 1.0], [3.0, 0.0, 0.0, 0.5, 0.0, 0.0]])
def test_quantiles_of_trapezoids_invert_their_distribution(pdf):
    places, density = np.array([0.0, 1.0, 1.5, 4.0, 4.2, 9.0]), np.array(pdf)
    sums = np.concatenate(([0.0], np.cumsum(0.5 * np.diff(places) * (density[1:] + density[:-1]))))
    u = np.concatenate((RNG.random(COUNT), sums[:-1] / sums[-1]))
    found = trapezoid_quantiles(places, density, sums, u)
    # The trapezoid rule is exact on straight lines.
    cut = np.searchsorted(places, found, side="right").clip(1, len(places) - 1)
    at = np.interp(found, places, density)
    below = sums[cut - 1] + 0.5 * (found - places[cut - 1]) * (density[cut - 1] + at)
    np.testing.assert_allclose(below / sums[-1], u, rtol=0.0, atol=1e-15)
