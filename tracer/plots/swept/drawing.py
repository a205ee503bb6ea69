"""Figures of one number a point: lines with error bars against what varies, or a map over two of it."""

from collections.abc import Sequence
from math import floor, log10
from typing import Any, NamedTuple

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, MaxNLocator
from numpy.typing import NDArray

from tracer.plots.colour_scale import ROOM_BELOW, bar_below, colour_span, draw_colour_bar, log_norm
from tracer.plots.curves import Curve, draw_legend, legend_height, release_curve
from tracer.plots.field import Field
from tracer.plots.hatching import hatch_rectangles
from tracer.plots.log_range import log_range
from tracer.plots.log_ticks import set_log_ticks
from tracer.plots.significance import HATCHED_WORDS, say_nothing
from tracer.plots.style import SMALL_SIZE, WIDTHS, Box, Width, axes_in, styled
from tracer.plots.swept.axes import KEY, Points, Values
from tracer.plots.words import broken, framed_figure, plain

LEFT, RIGHT, TOP, BOTTOM, LEGEND_GAP = 16.5, 5.0, 2.0, 10.5, 1.0
HEIGHTS: dict[Width, float] = {"column": 58.0, "full": 80.0}
"""Distances [mm] round the panel, and its height."""
ROOM = 0.06
"""Free room at the ends of an axis, over the whole."""
LOG_FROM = 30.0
"""Ratio of the largest to the least value above which they lie on a logarithmic axis."""
MOST_DECADES = 6.0
MARKERS = ("o", "s", "^", "D", "v", "P")
ERROR_WORDS = "Error bars: one standard error of the Monte Carlo sampling of each point."
SEED_WORDS = (
    "Points share their random numbers: differences between them are usually known better than the bars say."
)
SEED = "ensemble.seed"
PLAIN = (1e-3, 1e5)
"""Numbers between these are written without powers of ten."""
STEPS, STEPS_OF_ANGLES = (1, 2, 5, 10), (1, 1.5, 3, 4.5, 6, 9, 10)
ARROW = 0.05
"""Length of the arrows of lower limits, over the axis."""
BARS: dict[str, Any] = {"elinewidth": 0.6, "capsize": 1.5, "capthick": 0.6, "markersize": 3.0}


class Line(NamedTuple):
    """One line of a figure: its look and marker, and a number with its error at each point, shape (N,).

    `at_least` marks points whose number is a lower limit.
    """

    look: Curve
    marker: str
    field: Field
    at_least: NDArray[np.bool_] | None = None


class Words(NamedTuple):
    """What a figure says: the line below the title, the axis of the numbers, the caption."""

    subtitle: str
    label: str
    caption: str


def family_lines(points: Points, fields: Field, at_least: NDArray[np.bool_] | None = None) -> list[Line]:
    """Return a line for each of the family, from numbers of shape (F, N); a black one where there is no family."""
    if points.family is None:
        looks = [Curve("", "black", "-", 1.0)]
    else:
        looks = [
            release_curve(i, f"{points.family.name} {word}") for i, word in enumerate(points.family.words)
        ]
    return [
        Line(
            look,
            MARKERS[i % len(MARKERS)],
            Field(fields.value[i], fields.error[i]),
            None if at_least is None else at_least[i],
        )
        for i, look in enumerate(looks)
    ]


def lines_figure(
    sweep: xr.Dataset, points: Points, lines: Sequence[Line], words: Words, width: Width
) -> Figure:
    """Return lines with error bars against what varies."""
    looks = [line.look._replace(marker=line.marker) for line in lines if line.look.name]
    legend = legend_height(looks, width) + LEGEND_GAP if looks else 0.0
    with styled():
        figure, box = framed_figure(
            width,
            TOP + HEIGHTS[width] + BOTTOM + legend,
            str(sweep.attrs.get("title", "")),
            words.subtitle,
            " ".join(
                text for text in (words.caption, ERROR_WORDS, _seed_words(sweep), _pair_words(points)) if text
            ),
        )
        across = WIDTHS[width] - LEFT - RIGHT
        axes = axes_in(figure, Box(LEFT, box.bottom + legend + BOTTOM, across, HEIGHTS[width]))
        _set_axis(axes, points.along)
        axes.set(xlabel=plain(points.along.label), ylabel=words.label)
        _set_numbers(axes, [line.field for line in lines])
        axes.grid(color="0.92", linewidth=0.4)
        axes.set_axisbelow(True)
        for line in lines:
            _draw_line(axes, points.along, line)
        if not any(line.field.hit.any() for line in lines):
            say_nothing(axes, 0.5)
        if looks:
            draw_legend(figure, looks, width, box.bottom + legend - LEGEND_GAP)
    return figure


def map_figure(
    sweep: xr.Dataset, points: Points, field: Field, words: Words, colours: str, width: Width
) -> Figure:
    """Return numbers of shape (F, N) in logarithmic colours over two swept dimensions."""
    assert points.family is not None
    caption = HATCHED_WORDS.format(nothing="nothing counted") if not field.significant.all() else ""
    with styled():
        figure, box = framed_figure(
            width,
            TOP + HEIGHTS[width] + ROOM_BELOW,
            str(sweep.attrs.get("title", "")),
            words.subtitle,
            " ".join(text for text in (words.caption, caption, _pair_words(points)) if text),
        )
        panel = Box(LEFT, box.bottom + ROOM_BELOW, WIDTHS[width] - LEFT - RIGHT, HEIGHTS[width])
        axes = axes_in(figure, panel)
        columns, rows = _edges(points.along), _edges(points.family)
        span = colour_span([field])
        _set_axis(axes, points.along)
        _set_axis(axes, points.family, False)
        if span is None:
            say_nothing(axes, 0.5)
        else:
            value = np.ma.masked_where(~field.hit, field.value)
            axes.pcolormesh(columns, rows, value, norm=log_norm(span), cmap=colours)
        hatch_rectangles(axes, columns, rows, ~field.significant)
        for low, high, set_limits in ((*_ends(columns), axes.set_xlim), (*_ends(rows), axes.set_ylim)):
            set_limits(low, high)
        axes.set(xlabel=plain(points.along.label), ylabel=plain(points.family.label))
        draw_colour_bar(axes_in(figure, bar_below(panel)), span, colours, words.label, [field])
    return figure


def _draw_line(axes: Axes, along: Values, line: Line) -> None:
    field, x = line.field, along.numbers
    hit = field.hit
    error = np.where(np.isfinite(field.error), field.error, 0.0)
    dashes = "none" if along.are_words else line.look.dashes
    bars = axes.errorbar(
        x,
        # Not a number leaves a gap in the line.
        np.where(hit, field.value, np.nan),
        yerr=np.where(hit, error, np.nan),
        fmt=line.marker,
        color=line.look.colour,
        linestyle=dashes,
        linewidth=line.look.width,
        **BARS,
    )
    # Bars themselves are never dashed.
    for part in bars.lines[2]:
        part.set_linestyle("-")
    if line.at_least is not None and (limits := hit & line.at_least).any():
        low, high = axes.get_ylim()
        axes.errorbar(
            x[limits],
            field.value[limits],
            yerr=ARROW * (high - low),
            lolims=True,
            fmt="none",
            color=line.look.colour,
            elinewidth=0.6,
            capsize=2.0,
        )


def _set_axis(axes: Axes, values: Values, across: bool = True) -> None:
    """Give the horizontal axis, or the vertical, the scale, limits and ticks of swept values."""
    numbers, axis = values.numbers, axes.xaxis if across else axes.yaxis
    limits, scale = (axes.set_xlim, axes.set_xscale) if across else (axes.set_ylim, axes.set_yscale)
    low, high = float(numbers.min()), float(numbers.max())
    if values.are_words:
        limits(-0.5, len(numbers) - 0.5)
        axis.set_ticks(
            numbers, [plain((broken(word, 20.0, SMALL_SIZE, 1) or [""])[0]) for word in values.words]
        )
    elif values.is_logarithmic:
        scale("log")
        room = (high / low) ** ROOM
        limits(low / room, high * room)
        set_log_ticks(axis, low, high)
    else:
        room = ROOM * (high - low or max(abs(low), 1.0))
        limits(low - room, high + room)
        steps = STEPS_OF_ANGLES if values.unit == "deg" else STEPS
        axis.set_major_locator(MaxNLocator(8, steps=steps))


def _set_numbers(axes: Axes, fields: Sequence[Field]) -> None:
    """Give the vertical axis a scale on which all numbers are seen, from 0 where they are of one size."""
    hit = np.concatenate([one.value[one.hit] for one in fields])
    if not hit.size:
        return
    if float(hit.max()) > LOG_FROM * float(hit.min()):
        span = log_range(fields, MOST_DECADES) or (1.0, 10.0)
        axes.set(yscale="log", ylim=span)
        set_log_ticks(axes.yaxis, *span)
        if PLAIN[0] < span[0] and span[1] < PLAIN[1]:
            axes.yaxis.set_major_formatter(FuncFormatter(lambda y, _: f"{y:g}"))
        return
    high = max(float((one.value + np.nan_to_num(one.error))[one.hit].max(initial=0.0)) for one in fields)
    axes.set_ylim(0.0, high * (1.0 + 2.0 * ROOM))
    if not PLAIN[0] < high < PLAIN[1]:
        power = floor(log10(high))
        axes.yaxis.set_major_formatter(FuncFormatter(lambda y, _: f"{y / 10.0**power:g}"))
        axes.set_ylabel(axes.get_ylabel().replace("(", rf"($10^{{{power}}}$ ", 1))


def _edges(values: Values) -> NDArray[np.float64]:
    """Return edges halfway between values, in logarithms where these lie evenly."""
    numbers = np.log(values.numbers) if values.is_logarithmic else values.numbers
    if len(numbers) == 1:
        ends = np.array([numbers[0] - 0.5, numbers[0] + 0.5])
    else:
        middles = 0.5 * (numbers[1:] + numbers[:-1])
        ends = np.concatenate([[2.0 * numbers[0] - middles[0]], middles, [2.0 * numbers[-1] - middles[-1]]])
    return np.exp(ends) if values.is_logarithmic else ends


def _ends(edges: NDArray[np.float64]) -> tuple[float, float]:
    return float(edges.min()), float(edges.max())


def _seed_words(sweep: xr.Dataset) -> str:
    swept = any(one.attrs.get(KEY) == SEED for one in sweep.variables.values())
    return "" if swept else SEED_WORDS


def _pair_words(points: Points) -> str:
    others = points.along.others
    return f"With {points.along.name} varies: {', '.join(others)}." if others else ""
