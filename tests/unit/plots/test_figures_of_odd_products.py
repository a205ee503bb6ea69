"""Figures of odd products: drawn without a warning (warnings are errors here), and every text readable."""

import numpy as np
import pytest
from matplotlib.text import Text

from tracer.plots.curves import BAND
from tracer.plots.density import density
from tracer.plots.ground_map import (
    CAPTURED,
    DIRECTIONS,
    ESCAPING,
    RELEASED,
    RETURNED,
    ground_map,
    vertical_column,
)
from tracer.plots.image import image
from tracer.plots.ledger import ledger
from tracer.plots.plan_table import read_plan
from tracer.plots.profile import profile
from tracer.plots.saving import figure_bytes
from tracer.plots.significance import NOTHING
from tracer.plots.style import styled
from tracer.plots.tail import tail
from tracer.plots.timeline import timeline
from tracer.plots.velocity import velocity


def image_from_north(product, release=None, width="full"):
    return image(product, "tail_from_north", None, release, width)


def along_tail(product, release=None, width="full"):
    return tail(product, "tail_from_north", None, release, width)


def by_velocity(product, release=None, width="full"):
    return velocity(product, None, None, release, width)


FIGURES = (density, image_from_north, vertical_column, ledger, profile, along_tail, by_velocity)
ODD = {
    "tiny values": {"size": 1e-300},
    "huge values": {"size": 1e300},
    "boulder without lines and replicates": {"radius": 50.0, "lines": (), "replicates": 0},
}
PIXEL = 1.0
RESOLVED = ("tail_from_north",)
"""Images resolved by velocity, for the figure that needs one."""


def drawn(figure):
    """Return the figure, drawn."""
    with styled():
        figure.canvas.draw()
    return figure


def shown_texts(figure):
    """Return what is written on the drawn figure, with its place; ticks outside their axis are not drawn."""
    renderer = figure.canvas.get_renderer()
    ticks = set()
    for axes in [*figure.axes, *(child for one in figure.axes for child in one.child_axes)]:
        for axis in (axes.xaxis, axes.yaxis):
            drawn_ticks = axis._update_ticks()
            every = [*axis.majorTicks, *axis.minorTicks]
            ticks |= {
                id(label) for tick in every if tick not in drawn_ticks for label in (tick.label1, tick.label2)
            }
    texts = [text for text in figure.findobj(Text) if text.get_visible() and text.get_text().strip()]
    return [(text.get_text(), text.get_window_extent(renderer)) for text in texts if id(text) not in ticks]


def assert_readable(figure):
    """Check that no text leaves the figure or lies over another."""
    page = figure.bbox
    texts = shown_texts(figure)
    for words, box in texts:
        inside = box.x0 > -PIXEL and box.y0 > -PIXEL and box.x1 < page.x1 + PIXEL and box.y1 < page.y1 + PIXEL
        assert inside, f"{words!r} leaves the figure"
    for index, (words, box) in enumerate(texts):
        for others, other in texts[index + 1 :]:
            across = min(box.x1, other.x1) - max(box.x0, other.x0)
            along = min(box.y1, other.y1) - max(box.y0, other.y0)
            assert across <= PIXEL or along <= PIXEL, f"{words!r} lies over {others!r}"


@pytest.mark.parametrize("figure", FIGURES)
@pytest.mark.parametrize("odd", ODD)
def test_odd_product_is_drawn_without_a_warning_and_readable(make_product, figure, odd):
    assert_readable(drawn(figure(make_product(**ODD[odd], resolved=RESOLVED), width="column")))


@pytest.mark.parametrize("figure", FIGURES)
def test_figure_is_readable_at_full_width(make_product, figure):
    one = drawn(figure(make_product(resolved=RESOLVED), width="full"))
    assert_readable(one)
    assert one.get_size_inches()[0] * 25.4 == pytest.approx(180.0)


@pytest.mark.parametrize("figure", [vertical_column, ledger, profile, along_tail, by_velocity])
def test_many_releases_and_a_long_title_are_readable(make_product, figure):
    many = tuple(f"release number {number}" for number in range(15))
    title = "What a long title, worth $5 or $6, " * 8
    assert_readable(
        drawn(figure(make_product(releases=many, title=title, resolved=RESOLVED), width="column"))
    )


@pytest.mark.parametrize("figure", FIGURES)
def test_empty_product_says_that_nothing_was_counted(make_product, empty, figure):
    one = drawn(figure(empty(make_product(resolved=RESOLVED)), width="column"))
    assert NOTHING in [words for words, _ in shown_texts(one)]


def test_letters_that_the_font_lacks_raise_no_warning(make_product):
    figure = vertical_column(make_product(title="\N{CJK UNIFIED IDEOGRAPH-6C34}"), width="column")
    assert figure_bytes(figure, ".png", 60).startswith(b"\x89PNG")


def test_a_single_cell_that_was_hit_has_a_colour_scale(make_product, empty):
    product = empty(make_product())
    product.vertical_column.values[0, 1, 2] = 5e4
    product.vertical_column_standard_error.values[0, 1, 2] = 1e3
    figure = drawn(vertical_column(product, width="column"))
    low, high = figure.axes[-1].get_xlim()
    assert low <= 5.0 <= high


@pytest.mark.parametrize("what", [RELEASED, RETURNED, CAPTURED, ESCAPING, DIRECTIONS])
def test_map_is_readable_in_a_column_and_says_where_nothing_was_counted(make_product, empty, what):
    product = make_product()
    assert_readable(drawn(ground_map(product, what, width="column")))
    one = drawn(ground_map(empty(product), what, width="column"))
    assert NOTHING in [words for words, _ in shown_texts(one)]


@pytest.mark.parametrize("figure", [profile, along_tail, by_velocity])
def test_curves_without_replicates_say_why_they_have_no_bands(make_product, figure):
    one = figure(make_product(replicates=0, resolved=RESOLVED))
    assert not [band for axes in one.axes for band in axes.collections if band.get_gid() == BAND]
    assert "No error bands" in " ".join(text.get_text() for text in one.texts)


def test_layer_that_was_never_hit_is_a_gap(make_product):
    product = make_product()
    product.number_density.values[:, 2] = 0.0
    product.number_density_replicates.values[:, :, 2] = 0.0
    values = profile(product).axes[0].patches[0].get_data().values
    assert np.isnan(values).tolist() == [False, False, True, False]


ODD_PLANS = [
    ({}, "full"),
    ({}, "column"),
    ({"rows": 1, "forbidden": ()}, "column"),
    ({"brightness": 0.0}, "column"),
    ({"brightness": 1e200}, "column"),
]


@pytest.mark.parametrize(("plan", "width"), ODD_PLANS)
def test_plan_is_drawn_without_a_warning_and_readable(make_plan, plan, width):
    assert_readable(drawn(timeline(read_plan(make_plan(**plan)), width)))


@pytest.mark.parametrize(("top", "width"), [(0.3, "column"), (8.0, "column"), (8.0, "full"), (120.0, "full")])
def test_planes_of_any_size_are_readable(make_product, top, width):
    assert_readable(drawn(density(make_product(top=top), width=width)))
