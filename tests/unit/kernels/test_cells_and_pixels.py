"""Every position is counted in the cell and pixel that hold it, and in no other."""

import numpy as np
import pytest

from tracer.engine.kernel_world import kernel_world
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.kernels.cell_tables import LOG_DIGITS, MANTISSA, ONE, make_tables
from tracer.kernels.cells import altitude_cell, image_pixel, latitude_cell, local_time_cell
from tracer.kernels.scoring import mean_survival_time

LOOKS = ("north", "south", "dawn", "dusk", "sun", "midnight")


@pytest.fixture(scope="module")
def scene(small_run_file):
    return build_scene(load_run(small_run_file, ["grid.altitude.cells=40"]))


@pytest.fixture(scope="module")
def world(scene):
    return kernel_world(scene)


def test_altitude_cells_are_those_of_the_edges(scene, world):
    radii = scene.grid.body_radius + scene.grid.altitude_edges
    rng = np.random.default_rng(1)
    inside = rng.uniform(radii[0], radii[-1], 2_000)
    near = np.concatenate([np.nextafter(radii, 0.0)[1:], radii[:-1], np.nextafter(radii, np.inf)[:-1]])
    for r in np.concatenate((inside, near)):
        assert altitude_cell(world.cells, r) == np.searchsorted(radii, r, side="right") - 1


def test_above_the_top_is_no_cell_and_below_the_ground_the_lowest(scene, world):
    top = scene.grid.body_radius + scene.grid.altitude_edges[-1]
    assert altitude_cell(world.cells, top) == -1
    assert altitude_cell(world.cells, 10.0 * top) == -1
    # A landing may lie a rounding below the ground.
    assert altitude_cell(world.cells, scene.grid.body_radius * (1.0 - 1e-12)) == 0


def test_latitude_cells_count_from_the_south_pole(scene, world):
    edges = scene.grid.latitude_edges
    for latitude in np.random.default_rng(2).uniform(-90.0, 90.0, 500):
        cell = latitude_cell(world.cells, np.sin(np.radians(latitude)))
        assert edges[cell] <= latitude <= edges[cell + 1]
    assert latitude_cell(world.cells, -1.0 - 1e-16) == 0
    assert latitude_cell(world.cells, 1.0 + 2e-16) == len(edges) - 2


@pytest.mark.parametrize(
    ("x", "y", "hour"),
    # Noon at +x, dusk at +y, midnight at -x, dawn at -y; a little later than each.
    [(1.0, 0.001, 12.0), (-0.001, 1.0, 18.0), (-1.0, -0.001, 0.0), (0.001, -1.0, 6.0), (-1.0, 0.001, 23.99)],
)
def test_local_time_grows_from_midnight_by_dawn_noon_and_dusk(scene, world, x, y, hour):
    edges = scene.grid.local_time_edges
    cell = local_time_cell(world.cells, x, y)
    assert edges[cell] <= hour < edges[cell + 1]


def test_midnight_is_the_first_cell_from_both_sides(world):
    assert local_time_cell(world.cells, -1.0, 0.0) == 0
    assert local_time_cell(world.cells, -1.0, -0.0) == 0


def image_world(small_run_file, look: str):
    scene = build_scene(load_run(small_run_file, [f"image[1].look_from={look}"]))
    return scene.planes[0], kernel_world(scene).images, scene.body.radius


@pytest.mark.parametrize("look", LOOKS)
def test_pixels_follow_right_and_up_of_the_viewer(small_run_file, look):
    plane, images, radius = image_world(small_run_file, look)
    columns = len(plane.horizontal_edges) - 1
    for point in np.random.default_rng(3).uniform(-6.0, 6.0, (500, 3)) * radius:
        across, along = point @ plane.right, point @ plane.up
        column = np.searchsorted(plane.horizontal_edges, across, side="right") - 1
        row = np.searchsorted(plane.vertical_edges, along, side="right") - 1
        framed = 0 <= column < columns and 0 <= row < len(plane.vertical_edges) - 1
        hidden = np.hypot(across, along) < radius and point @ plane.toward_viewer < 0.0
        expected = row * columns + column if framed and not hidden else -1
        assert image_pixel(images, 0, radius, *point) == expected


@pytest.mark.parametrize(
    ("look", "sun", "dusk"),
    # Seen from north the Sun is at the right and dusk up; from dawn the Sun at the right, from dusk at the left.
    [("north", (1, 0), (0, 1)), ("dawn", (1, 0), (0, 0)), ("dusk", (-1, 0), (0, 0)), ("sun", (0, 0), (1, 0))],
)
def test_sun_and_dusk_stand_where_the_viewer_sees_them(small_run_file, look, sun, dusk):
    plane, _, _ = image_world(small_run_file, look)
    for way, place in (((1.0, 0.0, 0.0), sun), ((0.0, 1.0, 0.0), dusk)):
        assert (np.dot(way, plane.right), np.dot(way, plane.up)) == place


def test_gas_behind_the_disc_is_hidden_and_before_it_is_not(small_run_file):
    _, images, radius = image_world(small_run_file, "north")
    assert image_pixel(images, 0, radius, 0.5 * radius, 0.0, 1.2 * radius) >= 0
    assert image_pixel(images, 0, radius, 0.5 * radius, 0.0, -1.2 * radius) == -1
    assert image_pixel(images, 0, radius, 1.01 * radius, 0.0, -1.2 * radius) >= 0


def test_survival_time_is_the_integral_of_survival():
    t = np.linspace(0.0, 500.0, 200_001)
    expected = np.trapezoid(np.exp(-0.01 * t), t)
    assert mean_survival_time(0.01, 500.0) == pytest.approx(expected, rel=1e-9)
    assert mean_survival_time(0.0, 500.0) == 500.0
    assert mean_survival_time(1e-18, 500.0) == pytest.approx(500.0, rel=1e-14)


@pytest.mark.parametrize("first", [1e-3, 1.0, 1e3])
def test_guesses_are_never_above_the_cell_however_low_it_is(first):
    # Of 1 mm beside 6,000 km a part in a million millions is lost in rounding.
    radii = 6e6 + np.concatenate([[0.0], np.geomspace(first, 1e5, 30)])
    tables = make_tables(radii, first, 18, 24)
    for entry in range(len(tables.layers)):
        ratio = np.int64((entry << (MANTISSA - LOG_DIGITS)) + (ONE << MANTISSA)).view(np.float64)
        just_below = np.nextafter(6e6 + first * ratio, 0.0)
        assert tables.layers[entry] <= max(0, np.searchsorted(radii[:-1], just_below, side="right") - 1)
    assert tables.layers[0] == 0
