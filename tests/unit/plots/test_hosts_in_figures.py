"""The host planet of a moon stands in the figures where the product says, and is named."""

import math

import pytest
from matplotlib.patches import Circle

from tracer.plots.body import LIMB
from tracer.plots.density import density
from tracer.plots.host import HOST
from tracer.plots.image import image
from tracer.plots.velocity import velocity

RADIUS, HOST_RADIUS = 1.8e6, 0.5
"""Of the body [m], and of its host in radii of the body."""


@pytest.fixture
def beside(make_product):
    """Return a function that makes a product whose host stands at a place in body radii."""

    def make(x, y, z=0.0, **options):
        product = make_product(**options)
        product.attrs |= {
            "host": "Harrow",
            "host_radius": HOST_RADIUS * RADIUS,
            "host_position": [RADIUS * x, RADIUS * y, RADIUS * z],
        }
        return product

    return make


def limbs(axes):
    """Return middle and radius of all limbs but the body's own, the first."""
    circles = [one for one in axes.patches if isinstance(one, Circle) and one.get_gid() == LIMB]
    assert (circles[0].center, circles[0].radius) == ((0.0, 0.0), 1.0)
    return [(*one.center, one.radius) for one in circles[1:]]


def names(axes):
    return [text.get_text() for text in axes.texts if text.get_gid() == HOST]


def caption(figure):
    return " ".join(text.get_text() for text in figure.texts)


# Seen from north dusk is up; from dawn the Sun is at the right and north up, from dusk the Sun at the left.
@pytest.mark.parametrize(
    ("view", "right", "up"),
    [("tail_from_north", -2.0, 1.5), ("from_dawn", -2.0, 0.7), ("from_dusk", 2.0, 0.7)],
)
def test_host_is_outlined_where_the_viewer_sees_it(beside, view, right, up):
    figure = image(beside(-2.0, 1.5, 0.7), view)
    assert limbs(figure.axes[0]) == [pytest.approx((right, up, HOST_RADIUS))]
    assert names(figure.axes[0]) == ["Harrow"]
    assert "Harrow is outlined" in caption(figure)


@pytest.mark.parametrize("width", ["column", "full"])
def test_velocity_maps_show_the_host_too(beside, width):
    figure = velocity(beside(-2.0, 0.0, resolved=("from_dusk",)), width=width)
    assert [limbs(axes) for axes in figure.axes if names(axes)] == 2 * [
        [pytest.approx((2.0, 0.0, HOST_RADIUS))]
    ]
    assert "Harrow is outlined" in caption(figure)


@pytest.mark.parametrize("place", [(-4.6, 0.0), (0.0, 2.6)])
def test_host_outside_an_image_is_not_spoken_of(beside, place):
    # The image ends at -4 and 3 radii along x and at 2 along y.
    figure = image(beside(*place), "tail_from_north")
    assert limbs(figure.axes[0]) == []
    assert names(figure.axes[0]) == []
    assert "Harrow is" not in caption(figure)


def test_host_that_an_image_shows_in_part_has_its_name_inside(beside):
    figure = image(beside(-4.3, 2.2), "tail_from_north")
    axes = figure.axes[0]
    figure.canvas.draw()
    (text,) = [one for one in axes.texts if one.get_gid() == HOST]
    box, frame = text.get_window_extent(), axes.get_window_extent()
    assert frame.x0 <= box.x0
    assert box.x1 <= frame.x1
    assert frame.y0 <= box.y0
    assert box.y1 <= frame.y1


def test_plane_cuts_the_host_in_a_smaller_circle(beside):
    # Pythagoras: a sphere of 0.5 cut 0.3 from its middle.
    equatorial, noon_midnight = density(beside(2.0, 1.0, 0.3)).axes[:2]
    assert limbs(equatorial) == [pytest.approx((2.0, 1.0, 0.4))]
    assert limbs(noon_midnight) == []
    equatorial, noon_midnight = density(beside(2.0, 0.3, 1.0)).axes[:2]
    assert limbs(equatorial) == []
    assert limbs(noon_midnight) == [pytest.approx((2.0, 1.0, 0.4))]


def test_planes_show_no_host_beyond_the_grid(beside):
    # The grid ends at 5 radii from the centre.
    assert limbs(density(beside(5.6, 0.0)).axes[0]) == []
    assert len(limbs(density(beside(5.4, 0.0)).axes[0])) == 1


@pytest.mark.parametrize(
    "change", [{"host_radius": math.nan}, {"host_position": [math.nan] * 3}, {"host_position": []}]
)
def test_product_that_does_not_tell_where_its_host_stands_shows_none(beside, change):
    product = beside(-2.0, 0.0)
    product.attrs |= change
    assert limbs(image(product, "tail_from_north").axes[0]) == []
    assert limbs(density(product).axes[0]) == []
