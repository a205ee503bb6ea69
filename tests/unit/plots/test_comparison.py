"""The figure of a comparison: what it shows, at both widths and for profiles of any kind."""

import numpy as np
import pytest

from tracer.observe.fit.result import Comparison, Correlations, Estimate, Points, RangeEnds
from tracer.plots.comparison import DATA, comparison
from tracer.plots.saving import figure_bytes
from tracer.plots.style import styled

RATE = Estimate(2e24, 1.9e24, 2.1e24, 1.8e24, 2.2e24)


def made(value, upper=(False,) * 5, background=0.0):
    value = np.asarray(value, dtype=float)
    points = Points(
        position=np.arange(5.0),
        value=value,
        sigma=0.1 * np.abs(value) + 0.1,
        upper=np.array(upper),
        model=value + background,
        model_error=0.02 * np.abs(value),
        residual=np.array([0.5, -0.5, 1.0, -6.0, 0.0]),
        parts={"desorption": 0.7 * value, "$vapour_%": 0.3 * value},
        background=np.full(5, background),
        unit="kR",
        position_unit="radii",
        position_words="Tangent altitude",
    )
    return Comparison(
        title="Harrow's tail, 5 $",
        products=("a.nc",),
        what="brightness of na_d2",
        view="seen from north",
        rates={"desorption": RATE, "$vapour_%": RATE},
        held_rates={},
        parameters={"$vapour_%": {"temperature": Estimate(3e3, 2.5e3, 3.5e3, 2e3, 4e3)}},
        background=None,
        chi_square=5.0,
        degrees_of_freedom=3,
        probability=0.17,
        minus_two_log_likelihood=5.0,
        range_ends=RangeEnds(200, 1, {"a": ((1.0, 1.0), (3.84, 3.84))}),
        correlations=Correlations(("a", "b"), np.eye(2)),
        points=points,
        statements=(),
        warnings=(),
    )


@pytest.mark.parametrize("width", ["column", "full"])
def test_long_words_and_many_numbers_stay_inside_the_figure(width):
    found = made([100.0, 50.0, 20.0, 8.0, 3.0])
    words = "Distance from the body's centre away from the Sun, in the sky"
    rate = Estimate(2.034e24, 1.545e24, 2.587e24, 1e24, 3e24)
    figure = comparison(
        found._replace(
            points=found.points._replace(position_words=words),
            rates=dict.fromkeys(("photon desorption", "impact vapour", "sputtering"), rate),
        ),
        width,
    )
    assert figure.axes[1].get_xlabel().replace("\n", " ") == f"{words} (body radii)"
    with styled():
        figure.canvas.draw()
        boxes = [text.get_window_extent() for text in (*figure.texts, figure.axes[1].xaxis.label)]
    assert all(box.x0 >= 0.0 and box.x1 <= figure.bbox.width for box in boxes)


@pytest.mark.parametrize("width", ["column", "full"])
def test_data_model_parts_and_residuals_are_drawn(width):
    figure = comparison(made([100.0, 50.0, 20.0, 8.0, 3.0], background=0.5), width)
    upper, lower = figure.axes
    assert upper.get_yscale() == "log"
    assert "Brightness of na_d2 (kR)" in upper.get_ylabel()
    assert lower.get_xlabel() == "Tangent altitude (body radii)"
    # model, two parts, background; data and upper limits
    assert len(upper.lines) >= 5
    points = upper.containers[0].lines[0]
    assert points.get_gid() == DATA
    np.testing.assert_array_equal(points.get_ydata(), [100.0, 50.0, 20.0, 8.0, 3.0])
    assert lower.get_ylim()[0] < -6.0 < 6.0 < lower.get_ylim()[1]
    labels = [text.get_text() for text in figure.legends[0].get_texts()]
    assert labels == ["measured", "model", "desorption", r"\$vapour_%", "background"]
    assert figure_bytes(figure, ".png", 60).startswith(b"\x89PNG")


def test_values_below_zero_and_upper_limits_are_drawn_on_a_straight_axis():
    figure = comparison(made([10.0, 5.0, -1.0, 2.0, 3.0], upper=(False, False, False, True, True)))
    upper = figure.axes[0]
    assert upper.get_yscale() == "linear"
    limits = next(line for line in upper.lines if line.get_gid() == "upper limits")
    np.testing.assert_array_equal(limits.get_xdata(), [3.0, 4.0])
    handles = figure.legends[0].legend_handles
    assert [(one.get_label(), one.get_marker()) for one in handles[:2]] == [
        ("measured", "o"),
        ("upper limits", "v"),
    ]
    assert figure_bytes(figure, ".svg").startswith(b"<?xml")
