"""Ranges are what people would have written by hand."""

import pytest

from tracer.engine.sweep.spacing import spaced
from tracer.errors import InputError


@pytest.mark.parametrize(
    ("first", "last", "count", "spacing", "values"),
    [
        ("0 deg", "330 deg", 4, "linear", ("0 deg", "110 deg", "220 deg", "330 deg")),
        ("0.1 eV", "0.3 eV", 3, "linear", ("0.1 eV", "0.2 eV", "0.3 eV")),
        ("600 K", "2400 K", 3, "logarithmic", ("600 K", "1200 K", "2400 K")),
        ("1 km", "3000 m", 3, "linear", ("1 km", "2 km", "3 km")),
        ("5 radii", "10 radii", 2, "linear", ("5 radii", "10 radii")),
        ("1e23 s-1", "1e25 s-1", 3, "logarithmic", ("1e23 s-1", "1e24 s-1", "1e25 s-1")),
        (1.0, 0.0, 3, "linear", (1.0, 0.5, 0.0)),
        (10, 30, 3, "linear", (10, 20, 30)),
        (1, 2, 3, "linear", (1.0, 1.5, 2.0)),
    ],
)
def test_ends_are_kept_and_values_come_in_the_unit_of_the_first(first, last, count, spacing, values):
    found = spaced(first, last, count, spacing, "axis")
    assert found == values
    assert [type(value) for value in found] == [type(value) for value in values]


@pytest.mark.parametrize(
    ("first", "last", "spacing", "message"),
    [
        ("0 deg", "0 deg", "linear", 'axis.last: "0 deg" is the first value again; a range needs two ends'),
        ("0 deg", "3 km", "linear", 'axis.last: "3 km" is not measured in the unit of first, "deg"'),
        ("0 deg", 3.0, "linear", 'axis.last: 3.0 is not measured in the unit of first, "deg"'),
        (
            "surface",
            "300 K",
            "linear",
            'axis.first: "surface" is no number with a unit; a list of values takes words',
        ),
        (
            "1 K",
            "inf K",
            "linear",
            'axis.last: "inf K" is no number with a unit; a list of values takes words',
        ),
        (
            "0 s-1",
            "1 s-1",
            "logarithmic",
            'axis.spacing: a logarithmic range needs ends above 0, and goes from "0 s-1" to "1 s-1"',
        ),
    ],
)
def test_ends_that_make_no_range_are_refused(first, last, spacing, message):
    with pytest.raises(InputError) as refusal:
        spaced(first, last, 3, spacing, "axis")
    assert str(refusal.value) == message
