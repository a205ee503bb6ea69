from fractions import Fraction
from math import pi

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tracer.tally.axes import (
    Grid,
    altitude_edges,
    cell_area,
    cell_solid_angle,
    cell_volume,
    direction,
    latitude_edges,
    local_time_edges,
    make_grid,
    make_image_plane,
    middles,
    viewer_direction,
)

counts = st.integers(1, 60)


@st.composite
def grids(draw):
    first = draw(st.floats(1.0, 1e5))
    top = first * draw(st.floats(1.5, 1e5))
    return make_grid(draw(st.floats(1e2, 1e8)), first, top, draw(counts), draw(counts), draw(counts))


def shell_volume(inner, outer):
    """Volume of a shell from exact whole-number arithmetic."""
    return 4.0 / 3.0 * pi * float(Fraction(outer) ** 3 - Fraction(inner) ** 3)


@given(grids())
def test_cell_volumes_sum_to_the_shell(grid):
    total = cell_volume(grid).sum() * (len(grid.local_time_edges) - 1)
    outer = Fraction(grid.body_radius) + Fraction(grid.altitude_edges[-1])
    assert total == pytest.approx(shell_volume(grid.body_radius, outer), rel=1e-12)


@given(grids())
def test_cell_areas_sum_to_the_sphere(grid):
    cells = len(grid.local_time_edges) - 1
    assert cell_area(grid).sum() * cells == pytest.approx(4.0 * pi * grid.body_radius**2, rel=1e-12)
    assert cell_solid_angle(grid).sum() * cells == pytest.approx(4.0 * pi, rel=1e-12)


def test_a_thin_cell_on_a_large_body_keeps_its_digits():
    radius, thickness = 7e7, 1e-3
    grid = Grid(radius, np.array([0.0, thickness]), latitude_edges(1), local_time_edges(1))
    exact = shell_volume(radius, Fraction(radius) + Fraction(thickness))
    assert cell_volume(grid)[0, 0] == pytest.approx(exact, rel=1e-12)
    naive = 4.0 / 3.0 * pi * ((radius + thickness) ** 3 - radius**3)
    assert naive != pytest.approx(exact, rel=1e-9)


def test_a_thin_cell_at_a_pole_keeps_its_digits():
    grid = make_grid(1e6, 1e4, 1e6, 1, 4096, 1)
    cap = np.radians(180.0 / 4096)
    assert cell_solid_angle(grid)[[0, -1]] == pytest.approx(4.0 * pi * np.sin(0.5 * cap) ** 2, rel=1e-12)


def test_altitude_edges_are_the_ground_and_even_steps_of_log_altitude():
    edges = altitude_edges(1e4, 1e7, 4)
    np.testing.assert_allclose(edges, [0.0, 1e4, 1e5, 1e6, 1e7], rtol=1e-14)
    assert (edges[1], edges[-1]) == (1e4, 1e7)
    assert altitude_edges(1e4, 1e7, 1).tolist() == [0.0, 1e7]
    assert middles(altitude_edges(1e4, 1e7, 1)).tolist() == [5e6]


def test_latitude_and_local_time_edges_are_even():
    assert latitude_edges(4).tolist() == [-90.0, -45.0, 0.0, 45.0, 90.0]
    assert local_time_edges(3).tolist() == [0.0, 8.0, 16.0, 24.0]
    edges = latitude_edges(36)
    assert (edges == -edges[::-1]).all()


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((1e4, 1e7, 0), "altitude needs at least 1 cell, got 0"),
        (
            (1e7, 1e7, 3),
            "the first cell must end between the surface and the top, got 10000000.0 m of 10000000.0 m",
        ),
        ((1e6, np.nextafter(1e6, 2e6), 9), "9 altitude cells do not fit between"),
    ],
)
def test_altitude_edges_that_would_not_rise_are_refused(arguments, message):
    with pytest.raises(ValueError, match=message):
        altitude_edges(*arguments)


# From north the Sun is at the right and dusk up; from dawn the Sun is at the right, from dusk at the left.
@pytest.mark.parametrize(
    ("word", "right", "up"),
    [
        ("north", (1, 0, 0), (0, 1, 0)),
        ("south", (-1, 0, 0), (0, 1, 0)),
        ("dawn", (1, 0, 0), (0, 0, 1)),
        ("dusk", (-1, 0, 0), (0, 0, 1)),
        ("sun", (0, 1, 0), (0, 0, 1)),
        ("midnight", (0, -1, 0), (0, 0, 1)),
    ],
)
def test_the_viewer_sees_the_sky_plane_upright(word, right, up):
    plane = make_image_plane("p", "P", viewer_direction(word), (-1, 1), (-1, 1), (2, 2))
    assert plane.right == right
    assert plane.up == up


@pytest.mark.parametrize(
    ("word", "place"),
    [
        ("sun", (0.0, 12.0)),
        ("dusk", (0.0, 18.0)),
        ("midnight", (0.0, 0.0)),
        ("dawn", (0.0, 6.0)),
        ("north", (90.0, 7.0)),
        ("south", (-90.0, 7.0)),
    ],
)
def test_a_place_in_the_sky_is_the_word_for_it(word, place):
    assert viewer_direction(place) == viewer_direction(word)


def test_an_unknown_word_is_refused_with_those_allowed():
    with pytest.raises(
        ValueError, match="'up' is no place to look from; allowed: north, south, dawn, dusk, sun"
    ):
        viewer_direction("up")


@given(st.floats(-90, 90), st.floats(0, 24))
def test_right_up_and_viewer_are_a_right_handed_frame(latitude, local_time):
    plane = make_image_plane("p", "P", direction(latitude, local_time), (-1, 1), (-1, 1), (1, 1))
    frame = np.array([plane.right, plane.up, plane.toward_viewer])
    np.testing.assert_allclose(frame @ frame.T, np.eye(3), atol=1e-14)
    assert np.linalg.det(frame) == pytest.approx(1.0, abs=1e-14)


def test_pixel_edges_run_from_end_to_end():
    plane = make_image_plane("p", "P", (0, 0, 1), (-3.0, 1.0), (-0.1, 0.1), (4, 10))
    assert plane.horizontal_edges.tolist() == [-3.0, -2.0, -1.0, 0.0, 1.0]
    assert (plane.vertical_edges == -plane.vertical_edges[::-1]).all()
    with pytest.raises(ValueError, match=r"vertical must rise, got 1\.0 m to 1\.0 m"):
        make_image_plane("p", "P", (0, 0, 1), (-3.0, 1.0), (1.0, 1.0), (4, 10))
