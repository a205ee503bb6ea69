"""One look-up in a map: between cells, over midnight, up to the poles."""

import numpy as np
import pytest
from scipy.interpolate import RegularGridInterpolator

from tracer.kernels.surface_map import SurfaceMap, below, cell_value, interpolated, interpolated_at
from tracer.tally.axes import direction

EVEN = SurfaceMap(
    np.arange(-85.0, 90.0, 10.0), np.arange(0.5, 24.0), np.random.default_rng(2).random((18, 24)) + 1.0
)
UNEVEN = SurfaceMap(
    np.array([-80.0, -60.0, -50.0, -10.0, 15.0, 80.0]),
    np.array([0.0, 1.0, 5.0, 6.5, 18.0, 21.0]),
    np.random.default_rng(3).random((6, 6)),
)
MAPS = pytest.mark.parametrize("table", [EVEN, UNEVEN], ids=["even", "uneven"])


@MAPS
def test_interpolation_is_that_of_a_general_library_on_the_map_continued_all_round(table):
    # The map written out to the poles and a day to either side, for scipy's interpolator.
    latitudes = np.concatenate(([-90.0], table.latitudes, [90.0]))
    values = np.concatenate((table.values[:1], table.values, table.values[-1:]))
    hours = np.concatenate([table.local_times + turn for turn in (-24.0, 0.0, 24.0)])
    expected = RegularGridInterpolator((latitudes, hours), np.concatenate([values] * 3, axis=1))
    rng = np.random.default_rng(4)
    places = np.column_stack([np.degrees(np.arcsin(rng.uniform(-1, 1, 500))), rng.uniform(0, 24, 500)])
    places = np.concatenate((places, [(90.0, 3.0), (-90.0, 3.0), (5.0, 0.0), (5.0, 23.999), (-85.0, 0.5)]))
    found = interpolated_at(table, np.array([direction(*place) for place in places]))
    # At a pole itself the local time of a direction is noon's.
    places[np.abs(places[:, 0]) == 90.0, 1] = 12.0
    np.testing.assert_allclose(found, expected(places), rtol=1e-11)


@MAPS
def test_values_at_the_middles_are_the_maps_own(table):
    for i, latitude in enumerate(table.latitudes):
        for j, hour in enumerate(table.local_times):
            place = direction(latitude, hour)
            assert interpolated(table, *place) == pytest.approx(table.values[i, j], rel=1e-12)
            assert cell_value(table, *place) == table.values[i, j]


@MAPS
def test_cells_end_halfway_between_their_middles(table):
    hours = np.append(table.local_times, table.local_times[0] + 24.0)
    for i in range(len(table.latitudes) - 1):
        edge = 0.5 * (table.latitudes[i] + table.latitudes[i + 1])
        for j, hour in enumerate(table.local_times):
            assert cell_value(table, *direction(edge - 1e-6, hour)) == table.values[i, j]
            assert cell_value(table, *direction(edge + 1e-6, hour)) == table.values[i + 1, j]
    for j in range(len(table.local_times)):
        edge = 0.5 * (hours[j] + hours[j + 1])
        after = (j + 1) % len(table.local_times)
        for i, latitude in enumerate(table.latitudes):
            assert cell_value(table, *direction(latitude, (edge - 1e-6) % 24.0)) == table.values[i, j]
            assert cell_value(table, *direction(latitude, (edge + 1e-6) % 24.0)) == table.values[i, after]


@MAPS
def test_outer_cells_reach_to_the_poles(table):
    for j, hour in enumerate(table.local_times):
        assert cell_value(table, *direction(89.999, hour)) == table.values[-1, j]
        assert cell_value(table, *direction(-89.999, hour)) == table.values[0, j]
        assert interpolated(table, *direction(89.999, hour)) == pytest.approx(table.values[-1, j], rel=1e-12)
    assert cell_value(table, 0.0, 0.0, 1.0) in table.values[-1]


@MAPS
def test_the_day_wraps_at_midnight(table):
    for latitude in (-70.0, 0.0, 33.0):
        before, after = direction(latitude, 24.0 - 1e-9), direction(latitude, 1e-9)
        assert interpolated(table, *before) == pytest.approx(interpolated(table, *after), rel=1e-8)


@pytest.mark.parametrize("length", [2, 3, 50])
def test_position_below_a_value_is_that_of_a_search(length):
    rng = np.random.default_rng(length)
    axis = np.cumsum(rng.random(length) ** 4 + 1e-3)
    for value in np.concatenate((axis, rng.uniform(axis[0] - 1.0, axis[-1] + 1.0, 200))):
        assert below(axis, value) == np.searchsorted(axis, value, side="right") - 1


def test_compiled_look_ups_equal_their_python_source():
    for place in np.random.default_rng(5).normal(size=(50, 3)):
        place = place / np.linalg.norm(place)
        for function in (interpolated, cell_value):
            np.testing.assert_allclose(
                function(UNEVEN, *place), function.py_func(UNEVEN, *place), rtol=1e-13, atol=0.0
            )
