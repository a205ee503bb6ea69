"""The field of bodies over gases: limits where they belong, names that cover nothing."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from matplotlib.text import Annotation, Text

from tracer.plots.retention_field import BodyPoint, GasLimit, retention_field, spread

MOON = BodyPoint("Moon", 387.0, 2376.0, True)
OTHERS = (
    BodyPoint("Io", 147.0, 2558.0, False),
    BodyPoint("Europa", 145.0, 2026.0, False),
    BodyPoint("Ganymede", 161.0, 2742.0, False),
    BodyPoint("Callisto", 171.0, 2441.0, False),
    BodyPoint("Phobos", 321.0, 11.3, False),
)
ARGON = GasLimit("Ar", 124.0, 150.0)
SODIUM = GasLimit("Na", 164.0, 198.0)
WORDS = "escape speed = 6.09 most probable speeds"


def names(figure):
    return {text.get_text(): text for text in figure.axes[0].texts if isinstance(text, Annotation)}


def test_limits_grow_as_the_square_root_of_temperature():
    axes = retention_field([MOON, *OTHERS], [ARGON], WORDS).axes[0]
    kept, six_times = axes.lines[:2]
    for line, at_one_kelvin in ((kept, ARGON.kept), (six_times, ARGON.six_times)):
        assert line.get_ydata() == pytest.approx(at_one_kelvin * np.sqrt(line.get_xdata()), rel=1e-12)
    assert axes.get_xscale() == axes.get_yscale() == "log"
    assert (axes.get_xlabel(), axes.get_ylabel()) == ("surface temperature [K]", "escape speed [km/s]")


def test_speeds_are_marked_in_kilometres_per_second():
    axes = retention_field([MOON], [ARGON], WORDS).axes[0]
    assert axes.yaxis.get_major_formatter()(2000.0, 0) == "2"


def test_asked_for_is_filled_and_the_far_below_is_left_out():
    figure = retention_field([MOON, *OTHERS], [ARGON, SODIUM], WORDS)
    faces = {
        float(line.get_ydata()[0]): line.get_markerfacecolor()
        for line in figure.axes[0].lines
        if line.get_marker() == "o"
    }
    assert faces.pop(MOON.escape_speed) == "black"
    assert set(faces.values()) == {"white"}
    assert "Phobos" not in names(figure)
    asked = BodyPoint("Phobos", 321.0, 11.3, True)
    assert "Phobos" in names(retention_field([asked], [ARGON], WORDS))


def test_no_name_covers_another():
    close = [BodyPoint(f"Moonlet {i}", 387.0 + 2.0 * i, 2376.0 + 15.0 * i, False) for i in (1, 2)]
    figure = retention_field([MOON, *close], [ARGON, SODIUM, GasLimit("K", 125.0, 151.0)], WORDS)
    figure.draw_without_rendering()
    # An annotation's own extent counts its arrow too; only the text matters.
    boxes = [Text.get_window_extent(text).shrunk(0.95, 0.6) for text in names(figure).values()]
    overlaps = [(i, j) for i in range(len(boxes)) for j in range(i) if boxes[i].overlaps(boxes[j])]
    assert overlaps == []


@pytest.mark.parametrize(
    "bodies",
    [
        [BodyPoint("Pebble", 50.0, 1e-3, True)],
        [BodyPoint("Giant", 5e4, 1e6, True)],
        [MOON, MOON._replace(name="Twin")],
        [BodyPoint(f"Body {i}", 100.0 + i, 1000.0 + i, True) for i in range(30)],
    ],
    ids=["tiny", "huge", "same place", "crowd"],
)
def test_odd_bodies_are_drawn_without_a_warning(bodies):
    gases = [GasLimit(f"gas {i}", 100.0 + i, 120.0 + i) for i in range(25)]
    figure = retention_field(bodies, gases, WORDS)
    figure.draw_without_rendering()
    low, high = figure.axes[0].get_ylim()
    assert all(low < body.escape_speed < high for body in bodies)


@settings(max_examples=50, deadline=None)
@given(st.lists(st.floats(0.0, 500.0), min_size=1, max_size=20), st.floats(1.0, 30.0))
def test_spread_keeps_order_gap_and_mean(places, gap):
    rising = np.sort(np.array(places))
    moved = spread(rising, gap)
    assert np.all(np.diff(moved) >= gap - 1e-9)
    assert np.mean(moved) == pytest.approx(np.mean(rising), abs=1e-9)
    if np.all(np.diff(rising) > gap + 1e-9):
        assert moved == pytest.approx(rising, abs=1e-9)
