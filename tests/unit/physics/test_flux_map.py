"""Release by a map: each cell's share, evenness inside, a map that is no map."""

import numpy as np
import pytest
from scipy.stats import chisquare, kstest, uniform

from tracer.kernels.surface_map import SurfaceMap, cell_value
from tracer.physics.release.place.flux_map import flux_map

COUNT = 40_000
FALSE_ALARM = 1e-3
"""Of each test on a fixed seed; fewer than twenty here."""

LATITUDES = np.arange(-75.0, 90.0, 30.0)
LOCAL_TIMES = np.arange(1.0, 24.0, 4.0)


def some_map() -> SurfaceMap:
    """Return a map with empty cells, an empty row, an empty last column and cells of very different flux."""
    values = np.random.default_rng(6).random((6, 6)) ** 3
    values[2], values[0, 0], values[:, -1] = 0.0, 0.0, 0.0
    return SurfaceMap(LATITUDES, LOCAL_TIMES, values)


def places(table: SurfaceMap, count: int = COUNT) -> np.ndarray:
    found = flux_map(table).places(np.random.default_rng(7).random((count, 2)))
    np.testing.assert_allclose(np.linalg.norm(found, axis=1), 1.0, rtol=1e-14)
    return found


def cells_of(found: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    latitude = np.degrees(np.arcsin(found[:, 2]))
    hour = (12.0 + np.arctan2(found[:, 1], found[:, 0]) * 12.0 / np.pi) % 24.0
    row = np.digitize(latitude, np.arange(-60.0, 90.0, 30.0))
    return row, np.digitize((hour + 1.0) % 24.0, np.arange(4.0, 24.0, 4.0))


def expected_shares(table: SurfaceMap) -> np.ndarray:
    """Return flux times the cell's area on the sphere: the middle local times 1, 5, ... have the edges 23, 3, 7, ..."""
    areas = np.diff(np.sin(np.radians(np.arange(-90.0, 91.0, 30.0))))[:, np.newaxis]
    shares = table.values * areas
    return shares / shares.sum()


def test_each_cell_gets_flux_times_area():
    table = some_map()
    counts = np.zeros((6, 6))
    np.add.at(counts, cells_of(places(table)), 1)
    shares = expected_shares(table)
    assert np.all(counts[shares == 0.0] == 0)
    kept = shares > 0.0
    assert chisquare(counts[kept], COUNT * shares[kept]).pvalue > FALSE_ALARM
    # Areas forgotten: the test sees it.
    wrong = table.values[kept] / table.values[kept].sum()
    assert chisquare(counts[kept], COUNT * wrong).pvalue < 1e-100


def test_atoms_are_even_within_a_cell():
    values = np.zeros((6, 6))
    values[4, 0] = 3e200
    found = places(SurfaceMap(LATITUDES, LOCAL_TIMES, values))
    low, high = np.sin(np.radians([30.0, 60.0]))
    assert kstest(found[:, 2], uniform(low, high - low).cdf).pvalue > FALSE_ALARM
    # The cell of local time 1 h reaches from 23 h over midnight to 3 h.
    hour = (np.arctan2(found[:, 1], found[:, 0]) * 12.0 / np.pi + 13.0) % 24.0
    assert kstest(hour, uniform(0.0, 4.0).cdf).pvalue > FALSE_ALARM
    assert kstest(np.arcsin(found[:, 2]), uniform(np.pi / 6.0, np.pi / 6.0).cdf).pvalue < 1e-10


def test_polar_cells_reach_the_poles():
    values = np.zeros((6, 6))
    values[5] = 1.0
    found = places(SurfaceMap(LATITUDES, LOCAL_TIMES, values))
    low = np.sin(np.radians(60.0))
    assert kstest(found[:, 2], uniform(low, 1.0 - low).cdf).pvalue > FALSE_ALARM


def test_an_even_map_is_an_even_release():
    latitudes, hours = np.array([-80.0, -20.0, 10.0, 85.0]), np.array([0.0, 3.0, 11.0, 17.5])
    found = places(SurfaceMap(latitudes, hours, np.full((4, 4), 7.0)))
    for axis in range(3):
        assert kstest(found[:, axis], uniform(-1.0, 2.0).cdf).pvalue > FALSE_ALARM


def test_places_lie_in_the_cells_that_the_kernels_look_up():
    table = some_map()
    assert all(cell_value(table, *place) > 0.0 for place in places(table, 3000))


def test_ends_of_the_even_numbers_are_the_ends_of_the_cells_with_flux():
    law = flux_map(some_map())
    # Of the southernmost row the first cell is empty; the last row's last is.
    first, last = law.places(np.array([[0.0, 0.0], [1.0 - 2.0**-53, 1.0 - 2.0**-53]]))
    np.testing.assert_allclose(first, (0.0, 0.0, -1.0), atol=1e-15)
    assert last[2] == pytest.approx(1.0, abs=1e-15)
    assert law.columns[0, 1] == 0.0
    assert law.columns[5, -2] == 1.0
    # Half way through the southernmost row and at its first atom: the edge of its second cell, 3 h.
    (edge,) = law.places(np.array([[0.5 * law.rows[1], 0.0]]))
    assert (12.0 + np.arctan2(edge[1], edge[0]) * 12.0 / np.pi) == pytest.approx(3.0, abs=1e-12)
