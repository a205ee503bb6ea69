"""Whatever the map, look-ups and releases keep to it."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from tracer.kernels.surface_map import SurfaceMap, cell_value, interpolated, place_of
from tracer.physics.release.place.flux_map import flux_map


@st.composite
def axes(draw, low: float, high: float, least: int) -> np.ndarray:
    """Return rising numbers, spaced by between 1 and 10 parts of the range."""
    steps = np.array(draw(st.lists(st.integers(1, 10), min_size=least, max_size=7)), dtype=float)
    edges = low + (high - low) * np.concatenate(([0.0], np.cumsum(steps))) / steps.sum()
    return 0.5 * (edges[1:] + edges[:-1])


@st.composite
def maps(draw) -> SurfaceMap:
    latitudes, hours = draw(axes(-90.0, 90.0, 2)), draw(axes(0.0, 24.0, 2))
    # Far from the smallest numbers there are, of which products have no digits left.
    numbers = st.just(0.0) | st.floats(1e-250, 1e3)
    values = draw(arrays(float, (len(latitudes), len(hours)), elements=numbers))
    return SurfaceMap(latitudes, hours, values)


EVEN = st.lists(st.tuples(st.floats(1e-3, 0.999), st.floats(1e-3, 0.999)), min_size=1)
"""Even numbers off their ends, where a place may be the pole, which has no local time."""

PLACES = st.tuples(st.floats(-1.0, 1.0), st.floats(-1.0, 1.0), st.floats(-1.0, 1.0)).filter(
    lambda place: np.linalg.norm(place) > 1e-3
)


@settings(deadline=None)
@given(maps(), PLACES)
def test_a_look_up_lies_between_the_values_of_the_map(table, place):
    place = tuple(np.array(place) / np.linalg.norm(place))
    found = interpolated(table, *place)
    low, high = table.values.min(), table.values.max()
    assert low - 1e-12 * high <= found <= high * (1.0 + 1e-12)
    assert cell_value(table, *place) in table.values


@settings(deadline=None)
@given(maps().filter(lambda table: table.values.any()), EVEN)
def test_releases_leave_cells_with_flux_alone(table, drawn):
    law = flux_map(table)
    places = law.places(np.array(drawn))
    np.testing.assert_allclose(np.linalg.norm(places, axis=1), 1.0, rtol=1e-14)
    for place in places:
        latitude, hour = place_of(*place)
        # Within rounding of an edge either neighbour may be the place's cell.
        near = [
            cell_value(table, *_direction(latitude + north, hour + east))
            for north in (-1e-6, 1e-6)
            for east in (-1e-6, 1e-6)
        ]
        assert max(near) > 0.0


@settings(deadline=None)
@given(maps().filter(lambda table: table.values.any()))
def test_shares_of_a_release_map_are_flux_times_area(table):
    law = flux_map(table)
    shares = np.diff(law.rows)[:, np.newaxis] * np.diff(law.columns, axis=1)
    areas = np.diff(law.sines)[:, np.newaxis] * np.diff(law.hours)
    expected = table.values * areas
    np.testing.assert_allclose(shares, expected / expected.sum(), rtol=1e-9, atol=1e-15)
    assert np.isclose(areas.sum(), 48.0, rtol=1e-12)


def _direction(latitude: float, hour: float) -> tuple[float, float, float]:
    theta, phi = np.radians(latitude), (hour - 12.0) * np.pi / 12.0
    return np.cos(theta) * np.cos(phi), np.cos(theta) * np.sin(phi), np.sin(theta)
