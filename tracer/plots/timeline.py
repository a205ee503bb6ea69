"""Figure: a planned observation in time."""

from collections.abc import Callable, Sequence
from datetime import datetime
from typing import Any, NamedTuple

import numpy as np
from matplotlib.axes import Axes
from matplotlib.dates import AutoDateLocator, ConciseDateFormatter
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, MaxNLocator
from numpy.typing import NDArray

from tracer.plots.curves import Curve, draw_band, draw_legend, legend_height, release_curve
from tracer.plots.field import Field
from tracer.plots.log_range import log_range
from tracer.plots.log_ticks import set_log_ticks
from tracer.plots.plan_table import FLAGS, FORBIDDEN, PlanTable
from tracer.plots.reading_units import KILORAYLEIGH
from tracer.plots.significance import say_nothing
from tracer.plots.style import SMALL_SIZE, WIDTHS, Box, Width, axes_in, styled
from tracer.plots.words import framed_figure

LEFT, RIGHT, TOP, BOTTOM, BETWEEN, LEGEND_GAP = 29.0, 5.0, 2.0, 10.5, 2.5, 1.0
FLAG_ROW, HIGHEST_ANGLE = 3.6, 235.0
"""Distances [mm] round and between the panels; height of a flag's row; end of
the axis of angles [deg], with room for the legend."""
FORBIDDEN_COLOUR, FLAG_COLOUR = "#D55E00", "0.35"
SMALLEST_PLAIN, LARGEST_PLAIN = 1e-3, 1e5
"""Values between these are written without powers of ten."""
MICROSECONDS_PER_DAY = 86400e6
FORBIDDEN_HATCH = "xxxx"
DEFAULT_CAUTION = "A planning aid: flight rules and the limits of the instrument team come first."
BAND_WORDS = "Bands: one standard error of the Monte Carlo sampling."

Floats = NDArray[np.float64]


class Panel(NamedTuple):
    """One of the panels above one another: height [mm] and how it is drawn."""

    height: float
    draw: Callable[[Axes, PlanTable, Floats], None]


def timeline(plan: PlanTable, width: Width = "full") -> Figure:
    """Return a plan in time: brightness by line, signal-to-noise ratio, geometry, flags.

    What must not be commanded is marked through all panels.

    Parameters
    ----------
    plan : PlanTable
        As `read_plan` gives it.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal.
    """
    looks = [release_curve(number, line) for number, line in enumerate(plan.lines)]
    flags = [name for name in FLAGS if plan.flags(name).any()]
    panels = [
        Panel(30.0, _draw_brightness),
        Panel(22.0, _draw_ratio),
        Panel(22.0, _draw_altitude),
        Panel(20.0, _draw_angles),
        Panel(FLAG_ROW * max(len(flags), 1), _draw_flags),
    ]
    forbidden = int(plan.flags(FORBIDDEN).sum())
    moments = plan.moments()
    x = _days(moments) if isinstance(moments, list) else moments
    legend = legend_height(looks, width) + LEGEND_GAP if looks else 0.0
    stack = sum(panel.height for panel in panels) + BETWEEN * (len(panels) - 1)
    with styled():
        figure, box = framed_figure(
            width,
            TOP + stack + BOTTOM + legend,
            plan.notes.get("title", "Planned observation"),
            f"{_over(plan)}{plan.rows} exposures, {forbidden or 'none'} marked as not to be commanded",
            f"{plan.notes.get('caution', DEFAULT_CAUTION)} {BAND_WORDS}",
        )
        top = box.bottom + legend + BOTTOM + stack
        for panel in panels:
            axes = axes_in(figure, Box(LEFT, top - panel.height, WIDTHS[width] - LEFT - RIGHT, panel.height))
            top -= panel.height + BETWEEN
            panel.draw(axes, plan, x)
            _shade_forbidden(axes, plan, x)
            _set_time(axes, x, isinstance(moments, list), panel is panels[-1], plan)
        draw_legend(figure, looks, width, box.bottom + legend - LEGEND_GAP)
    return figure


def _days(moments: list[datetime]) -> Floats:
    """Return dates as matplotlib counts them: days since 1970."""
    return np.array(moments, dtype="datetime64[us]").astype(np.float64) / MICROSECONDS_PER_DAY


def _over(plan: PlanTable) -> str:
    product = plan.notes.get("product_title")
    return f"{product}: " if product else ""


def _draw_brightness(axes: Axes, plan: PlanTable, x: Floats) -> None:
    fields = [
        Field(
            plan.numbers(f"brightness_{line}_rayleigh") * KILORAYLEIGH,
            plan.numbers(f"brightness_{line}_standard_error_rayleigh") * KILORAYLEIGH,
        )
        for line in plan.lines
    ]
    looks = [release_curve(number, line) for number, line in enumerate(plan.lines)]
    _draw_log(axes, x, list(zip(looks, fields, strict=True)), "Brightness\n(kR)")


def _draw_ratio(axes: Axes, plan: PlanTable, x: Floats) -> None:
    field = Field(plan.numbers("snr"), plan.numbers("snr_standard_error"))
    _draw_log(axes, x, [(Curve("snr", "black", "-", 0.8), field)], "Signal to noise")


def _draw_log(axes: Axes, x: Floats, curves: Sequence[tuple[Curve, Field]], label: str) -> None:
    span = log_range([field for _, field in curves])
    axes.set(yscale="log", ylim=span or (1.0, 10.0), ylabel=label)
    set_log_ticks(axes.yaxis, *axes.get_ylim())
    if span is not None and span[0] > SMALLEST_PLAIN and span[1] < LARGEST_PLAIN:
        axes.yaxis.set_major_formatter(FuncFormatter(lambda y, _: f"{y:g}"))
    for look, field in curves:
        draw_band(axes, x, field, look)
        # A value between gaps would leave no line.
        axes.plot(x, np.where(field.hit, field.value, np.nan), ".", color=look.colour, markersize=2.0)
    if span is None:
        say_nothing(axes, 0.5)


def _draw_altitude(axes: Axes, plan: PlanTable, x: Floats) -> None:
    axes.plot(x, plan.numbers("tangent_altitude_km"), ".-", color="black", linewidth=0.5, markersize=2.0)
    axes.set_ylabel("Tangent\naltitude (km)")
    axes.yaxis.set_major_locator(MaxNLocator(4))


def _draw_angles(axes: Axes, plan: PlanTable, x: Floats) -> None:
    for name, words, colour, dashes in (
        ("sun_angle_deg", "look from the Sun", "#D55E00", "-"),
        ("phase_angle_deg", "phase", "#0072B2", (0.0, (4.0, 1.5))),
    ):
        axes.plot(x, plan.numbers(name), color=colour, linestyle=dashes, label=words)
    axes.set(ylim=(0.0, HIGHEST_ANGLE), yticks=[0.0, 60.0, 120.0, 180.0], ylabel="Angle (deg)")
    axes.legend(
        loc="upper right", ncols=2, borderpad=0.2, borderaxespad=0.3, handlelength=2.2, framealpha=0.85
    )


def _draw_flags(axes: Axes, plan: PlanTable, x: Floats) -> None:
    shown = [name for name in FLAGS if plan.flags(name).any()]
    for row, name in enumerate(shown):
        for start, end in _spans(plan.flags(name), x):
            colour = FORBIDDEN_COLOUR if name == FORBIDDEN else FLAG_COLOUR
            axes.barh(row, end - start, 0.7, start, color=colour, linewidth=0.0)
    axes.set(ylim=(max(len(shown), 1) - 0.5, -0.5), yticks=range(len(shown)))
    axes.set_yticklabels([FLAGS[name] for name in shown])
    axes.tick_params(axis="y", length=0.0)
    if not shown:
        axes.text(
            0.5, 0.5, "no flags", transform=axes.transAxes, ha="center", va="center", fontsize=SMALL_SIZE
        )


def _shade_forbidden(axes: Axes, plan: PlanTable, x: Floats) -> None:
    for start, end in _spans(plan.flags(FORBIDDEN), x):
        axes.axvspan(
            start,
            end,
            facecolor="none",
            edgecolor=FORBIDDEN_COLOUR,
            hatch=FORBIDDEN_HATCH,
            alpha=0.35,
            linewidth=0.0,
            zorder=0.4,
            gid=FORBIDDEN,
        )


def _spans(flags: NDArray[np.bool_], x: Floats) -> list[tuple[float, float]]:
    """Return where runs of flagged exposures begin and end: halfway to their neighbours."""
    edges = _edges(x)
    steps = np.diff(np.pad(flags, 1).astype(np.int8))
    firsts, ends = np.flatnonzero(steps == 1), np.flatnonzero(steps == -1)
    return [(float(edges[a]), float(edges[b])) for a, b in zip(firsts, ends, strict=True)]


def _edges(x: Floats) -> Floats:
    if len(x) < 2:
        return np.array([x[0] - 0.5, x[0] + 0.5])
    middles = 0.5 * (x[1:] + x[:-1])
    return np.concatenate([[1.5 * x[0] - 0.5 * x[1]], middles, [1.5 * x[-1] - 0.5 * x[-2]]])


def _set_time(axes: Axes, x: Floats, dates: bool, last: bool, plan: PlanTable) -> None:
    edges = _edges(x)
    low, high = float(edges[0]), float(edges[-1])
    axes.set_xlim((low, high) if high > low else (low - 0.5, low + 0.5))
    axes.grid(axis="x", color="0.92", linewidth=0.4)
    axes.set_axisbelow(True)
    if dates:
        locator: Any = AutoDateLocator(minticks=3, maxticks=7)  # type: ignore[no-untyped-call]
        axes.xaxis.set_major_locator(locator)
        axes.xaxis.set_major_formatter(ConciseDateFormatter(locator, show_offset=False))  # type: ignore[no-untyped-call]
        label = f"Time, beginning {plan.columns['time'][0]}"
    else:
        axes.xaxis.set_major_locator(MaxNLocator(7))
        label = "Time" if plan.columns["time"].dtype.kind in "iuf" else "Exposure"
    if last:
        axes.set_xlabel(label)
    else:
        axes.tick_params(labelbottom=False)
