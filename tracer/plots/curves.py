"""Curves by release: their looks, error bands, and a legend below them."""

from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from numpy.typing import NDArray

from tracer.plots.field import Field
from tracer.plots.style import MILLIMETRES_PER_INCH, MILLIMETRES_PER_POINT, SMALL_SIZE, WIDTHS, Width
from tracer.plots.words import LETTER_WIDTH, MARGIN, broken, plain

SUM = "all releases"
BAND = "error band"
"""Name of the artist."""
OPACITY = 0.25
COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9")
"""Told apart in every kind of colour vision (Okabe & Ito 2008, Color Universal Design; memory)."""
DASHES: tuple[Any, ...] = (
    "-",
    (0.0, (5.0, 1.5)),
    (0.0, (1.5, 1.2)),
    (0.0, (6.0, 1.5, 1.2, 1.5)),
    (0.0, (9.0, 2.0)),
    (0.0, (3.0, 1.0, 1.0, 1.0, 1.0, 1.0)),
)
"""Told apart in grey print too; the next six releases take the colours again with other dashes."""
LEGEND_ROW, HANDLE = 3.4, 9.0
"""Height of a row of the legend, width of a line in it with its distances [mm]."""
MARKER_SIZE = 3.0


class Curve(NamedTuple):
    """A line of a figure: name, colour, dashes, width [pt], and the marker of its points in the legend."""

    name: str
    colour: str
    dashes: Any
    width: float = 1.0
    marker: str = ""


def release_curve(number: int, name: str) -> Curve:
    """Return the look of the release at place `number` of the product."""
    again = number // len(COLOURS)
    return Curve(name, COLOURS[number % len(COLOURS)], DASHES[(number + again) % len(DASHES)])


def sum_curve() -> Curve:
    """Return the look of the sum over releases."""
    return Curve(SUM, "black", "-", 1.2)


def draw_band(axes: Axes, x: NDArray[np.float64], field: Field, look: Curve) -> None:
    """Draw values against `x` with a band of one standard error; a gap where nothing was counted."""
    value = np.where(field.hit, field.value, np.nan)
    axes.plot(x, value, color=look.colour, linestyle=look.dashes, linewidth=look.width)
    low, high = value - field.error, value + field.error
    known = np.isfinite(high)
    if known.any():
        # On a logarithmic axis an error above the value reaches down without end.
        axes.fill_between(
            x,
            np.where(low > 0.0, low, 1e-3 * value),
            high,
            where=known,
            color=look.colour,
            alpha=OPACITY,
            linewidth=0.0,
            gid=BAND,
        )


def draw_stairs(axes: Axes, edges: NDArray[np.float64], field: Field, look: Curve) -> None:
    """Draw values of cells between `edges`, which run upwards, with a band of one standard error."""
    value = np.where(field.hit, field.value, np.nan)
    axes.stairs(
        value,
        edges,
        orientation="horizontal",
        baseline=None,
        color=look.colour,
        linestyle=look.dashes,
        linewidth=look.width,
    )
    low, high = value - field.error, value + field.error
    known = np.isfinite(high)
    if known.any():
        axes.fill_betweenx(
            np.repeat(edges, 2)[1:-1],
            np.repeat(np.where(known, np.where(low > 0.0, low, 1e-3 * value), np.nan), 2),
            np.repeat(np.where(known, high, np.nan), 2),
            color=look.colour,
            alpha=OPACITY,
            linewidth=0.0,
            gid=BAND,
        )


def legend_height(curves: Sequence[Curve], width: Width) -> float:
    """Return the height [mm] of the legend of `curves`."""
    columns = _columns(curves, width)
    return LEGEND_ROW * -(-len(curves) // columns)


def draw_legend(figure: Figure, curves: Sequence[Curve], width: Width, top: float) -> None:
    """Draw the legend of `curves`, its upper edge at `top` [mm] from the figure's foot."""
    across, height = figure.get_size_inches() * MILLIMETRES_PER_INCH
    columns = _columns(curves, width)
    room = (across - 2.0 * MARGIN) / columns - HANDLE
    figure.legend(
        handles=[
            Line2D(
                [],
                [],
                color=one.colour,
                linestyle=one.dashes,
                linewidth=one.width,
                marker=one.marker,
                markersize=MARKER_SIZE,
                label=_label(one, room),
            )
            for one in curves
        ],
        loc="upper left",
        bbox_to_anchor=(MARGIN / across, top / height),
        ncols=columns,
        frameon=False,
        borderpad=0.0,
        borderaxespad=0.0,
        handlelength=3.0,
        handletextpad=0.5,
        columnspacing=1.2,
    )


def _label(curve: Curve, room: float) -> str:
    return plain((broken(curve.name, room, SMALL_SIZE, 1) or [""])[0])


def _columns(curves: Sequence[Curve], width: Width) -> int:
    """Return how many columns of the longest name fit; at most two in a column of the page, four in all of it."""
    longest = (
        max((len(one.name) for one in curves), default=1) * LETTER_WIDTH * SMALL_SIZE * MILLIMETRES_PER_POINT
    )
    most = 2 if width == "column" else 4
    fitting = int((WIDTHS[width] - 2.0 * MARGIN) / (longest + HANDLE))
    return max(1, min(most, fitting, len(curves)))
