"""Colours are spread over the values that a figure has, and a figure without any needs no colour bar."""

import math

import numpy as np
import pytest

from tracer.plots.colour_scale import colour_span
from tracer.plots.density import density
from tracer.plots.field import Field
from tracer.plots.ground_map import vertical_column
from tracer.plots.image import image


def field(*values):
    value = np.array(values)
    return Field(value, 0.1 * value)


@pytest.mark.parametrize("values", [(3e4, 2e5), (9.0, 11.0), (7.0,)])
def test_values_within_a_decade_stand_in_the_middle_of_one(values):
    span = colour_span([field(*values)])
    assert span.high / span.low == pytest.approx(10.0)
    assert math.sqrt(span.low * span.high) == pytest.approx(math.sqrt(min(values) * max(values)))


def test_values_of_more_than_a_decade_have_all_colours():
    assert colour_span([field(2.0, 30.0), field(500.0)]) == pytest.approx((2.0, 500.0))


@pytest.mark.parametrize(
    ("figure", "name"),
    [
        (vertical_column, "vertical_column"),
        (density, "number_density"),
        (lambda ds: image(ds, "from_dawn"), "column_from_dawn"),
    ],
)
def test_figure_of_nothing_leaves_no_room_for_a_colour_bar(make_product, figure, name):
    full, empty = make_product(), make_product()
    empty[name].values[...] = 0.0
    empty[name + "_standard_error"].values[...] = np.nan
    # The caption has a line more, on hatches: less than the colour bar takes.
    assert figure(empty).get_figheight() < figure(full).get_figheight()
