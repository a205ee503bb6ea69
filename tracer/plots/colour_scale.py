"""Logarithmic colours and their bar."""

import math
from collections.abc import Sequence
from typing import Literal, NamedTuple

import numpy as np
from matplotlib.axes import Axes
from matplotlib.cm import ScalarMappable
from matplotlib.colors import LogNorm

from tracer.plots.field import Field
from tracer.plots.log_ticks import set_log_ticks
from tracer.plots.style import Box

MOST_DECADES = 7.0
FEWEST_DECADES = 1.0
ROUNDING = 1e-9
ROOM_BELOW, ROOM_FOR_LABELS = 22.5, 10.0
"""Room [mm] that labels and colour bar need below a panel, and that of labels alone."""
DROP, HEIGHT, SHORTEST, SHARE = 13.0, 2.5, 48.0, 0.7
"""Distance of the colour bar's lower edge below the panel, its height and least length [mm]; its length over the
panel's width."""
POINTS: dict[tuple[bool, bool], Literal["neither", "min", "max", "both"]] = {
    (False, False): "neither",
    (True, False): "min",
    (False, True): "max",
    (True, True): "both",
}
SMALLEST = 1e-280
"""Values below count as this: matplotlib takes limits near the smallest double number for no limits at all."""


class Span(NamedTuple):
    """Least and largest value that have a colour of their own."""

    low: float
    high: float


def colour_span(fields: Sequence[Field]) -> Span | None:
    """Return the span of the significant values of the fields; None where nothing was counted.

    Where no value is significant it spans all; it never spans more than `MOST_DECADES` below the largest, and
    never less than one, with the values in its middle.
    """
    values = np.concatenate([one.value[one.significant] for one in fields])
    if not values.size:
        values = np.concatenate([one.value[one.hit] for one in fields])
    if not values.size:
        return None
    top = math.log10(max(float(values.max()), SMALLEST))
    low = max(math.log10(max(float(values.min()), SMALLEST)), top - MOST_DECADES)
    room = 0.5 * max(FEWEST_DECADES - (top - low), 0.0)
    low, top = low - room, top + room
    return Span(10.0**low, 10.0**top)


def room_below(span: Span | None) -> float:
    """Return the room [mm] below a panel; without a span there is no colour bar."""
    return ROOM_FOR_LABELS if span is None else ROOM_BELOW


def log_norm(span: Span) -> LogNorm:
    """Return the norm of colours over a span."""
    return LogNorm(span.low, span.high)


def bar_below(panel: Box) -> Box:
    """Return the place of the colour bar of a panel, or of several whose hull it is."""
    length = max(SHARE * panel.width, SHORTEST)
    return Box(panel.left + 0.5 * (panel.width - length), panel.bottom - DROP, length, HEIGHT)


def draw_colour_bar(axes: Axes, span: Span | None, colours: str, label: str, fields: Sequence[Field]) -> None:
    """Draw a horizontal colour bar into `axes`, with a point at an end beyond which there are values.

    Where there is no span, nothing was counted and there is no bar.
    """
    if span is None:
        axes.remove()
        return
    lower = any(bool((one.value[one.hit] < span.low * (1.0 - ROUNDING)).any()) for one in fields)
    upper = any(bool((one.value[one.hit] > span.high * (1.0 + ROUNDING)).any()) for one in fields)
    bar = axes.figure.colorbar(
        ScalarMappable(log_norm(span), colours),
        cax=axes,
        orientation="horizontal",
        extend=POINTS[lower, upper],
        extendfrac=0.03,
    )
    set_log_ticks(bar.ax.xaxis, *span)
    bar.set_label(label)
    bar.outline.set_linewidth(0.5)
