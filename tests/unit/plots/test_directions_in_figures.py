"""Which side is which: the Sun, dusk and north lie where the design says, and so do night side and cells."""

import math

import numpy as np
import pytest
from matplotlib.collections import QuadMesh
from matplotlib.text import Annotation

from tracer.plots.body import NIGHT, SUN, night_side
from tracer.plots.density import density
from tracer.plots.image import image
from tracer.tally.axes import make_image_plane, viewer_direction


def hottest(axes):
    """Return where the middle of the fullest cell of the panel lies."""
    (mesh,) = [one for one in axes.collections if isinstance(one, QuadMesh)]
    values, corners = mesh.get_array(), mesh.get_coordinates()
    rows, columns = np.nonzero(values == values.max())
    # A cell is drawn in several pieces side by side.
    first, last = columns.min(), columns.max() + 1
    return corners[rows[0] : rows[0] + 2, first : last + 1].mean(axis=(0, 1))


def sky(look_from):
    plane = make_image_plane("i", "i", viewer_direction(look_from), (-1.0, 1.0), (-1.0, 1.0), (1, 1))
    return plane.toward_viewer, plane.up, plane.right


def area(outline):
    x, y = outline.T
    return 0.5 * abs(np.sum(x * np.roll(y, -1) - y * np.roll(x, -1)))


@pytest.mark.parametrize(("hour", "x", "y"), [(12.0, 1, 0), (18.0, 0, 1), (0.0, -1, 0), (6.0, 0, -1)])
def test_equatorial_plane_has_the_sun_at_the_right_and_dusk_up(make_product, hour, x, y):
    product = make_product()
    near = (abs(product.local_time - hour) <= 2.0) | (abs(product.local_time - hour - 24.0) <= 2.0)
    product.number_density.values[0, -1][:, near] *= 100.0
    at = hottest(density(product).axes[0])
    assert at @ (x, y) > 0.5 * np.linalg.norm(at)


@pytest.mark.parametrize(("hour", "latitude"), [(12.0, 67.5), (12.0, -67.5), (0.0, 67.5), (0.0, -22.5)])
def test_noon_midnight_plane_has_the_sun_at_the_right_and_north_up(make_product, hour, latitude):
    product = make_product()
    near = [2, 3] if hour == 12.0 else [0, 5]
    row = int(np.flatnonzero(product.latitude == latitude)[0])
    product.number_density.values[0, -1, row, near] *= 100.0
    at = hottest(density(product).axes[1])
    assert math.degrees(math.atan2(at[1], abs(at[0]))) == pytest.approx(latitude, abs=2.0)
    assert (at[0] > 0.0) == (hour == 12.0)


@pytest.mark.parametrize(("view", "side"), [("tail_from_north", 1), ("from_dawn", 1), ("from_dusk", -1)])
def test_sun_is_at_the_right_from_north_and_dawn_and_at_the_left_from_dusk(make_product, view, side):
    axes = image(make_product(), view).axes[0]
    (arrow,) = [one for one in axes.texts if isinstance(one, Annotation) and one.get_gid() == SUN]
    axes.figure.canvas.draw()
    tip, tail = arrow.xycoords.transform(arrow.xy), arrow.anncoords.transform(arrow.xyann)
    assert side * (tip[0] - tail[0]) > 0.0
    assert tip[1] == pytest.approx(tail[1])
    (night,) = [one for one in axes.patches if one.get_gid() == NIGHT]
    assert (side * night.get_xy()[:, 0] < 1e-12).all()


def test_viewer_at_the_sun_reads_where_it_is(make_product):
    words = [text.get_text() for text in image(make_product(), "from_the_sun").axes[0].texts]
    assert words == ["Sun behind the viewer"]


@pytest.mark.parametrize(
    "look_from", ["north", "dusk", "sun", "midnight", (30.0, 9.0), (-50.0, 20.0), (89.0, 1.0)]
)
def test_night_side_has_the_area_of_its_phase(look_from):
    # Lambert's geometry: of a disc seen at the phase angle a, the share (1 - cos a)/2 is dark.
    toward_viewer, up, right = sky(look_from)
    dark = 0.5 * (1.0 - toward_viewer[0])
    assert area(night_side(toward_viewer, up, right)) == pytest.approx(math.pi * dark, abs=2e-3)


@pytest.mark.parametrize("look_from", [(30.0, 9.0), (-50.0, 20.0)])
def test_night_side_lies_away_from_the_sun(look_from):
    toward_viewer, up, right = sky(look_from)
    middle = night_side(toward_viewer, up, right).mean(axis=0)
    assert middle @ (right[0], up[0]) < 0.0


def test_image_shows_each_pixel_where_it_lies(make_product):
    product = make_product()
    product.column_from_dawn.values[0, 4, 6] *= 100.0
    radius = product.body_radius
    expected = (product.from_dawn_horizontal[6] / radius, product.from_dawn_vertical[4] / radius)
    np.testing.assert_allclose(hottest(image(product, "from_dawn").axes[0]), expected, rtol=1e-12)


def flattened(product, factor):
    """Return a product whose image from north is `factor` times longer."""
    axis = "tail_from_north_horizontal"
    longer = product.assign_coords({axis: product[axis] * factor})
    return longer.assign({f"{axis}_bounds": longer[f"{axis}_bounds"] * factor})


@pytest.mark.parametrize("width", ["column", "full"])
def test_very_flat_image_is_stretched_upwards_and_says_so(make_product, width):
    figure = image(flattened(make_product(), 50.0), "tail_from_north", width=width)
    figure.canvas.draw()
    axes = figure.axes[0]
    box = axes.get_window_extent()
    # 18 mm, and across the whole panel: 350 by 4 radii would be a line.
    assert box.height / figure.dpi * 25.4 == pytest.approx(18.0, rel=1e-6)
    across, up = np.ptp(axes.get_xlim()), np.ptp(axes.get_ylim())
    stretch = (box.height / up) / (box.width / across)
    assert stretch > 5.0
    words = " ".join(" ".join(text.get_text() for text in figure.texts).split())
    assert f"The vertical is drawn {stretch:.2g} times larger than the horizontal." in words
    assert "Ellipse: the body" in words
    plain = image(make_product(), "tail_from_north", width=width)
    assert plain.axes[0].get_aspect() == 1.0
    assert "larger than the horizontal" not in " ".join(text.get_text() for text in plain.texts)
