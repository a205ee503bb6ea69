"""Figure: a measured profile, the model that explains it, its parts, and what is left."""

from collections.abc import Sequence

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from tracer.observe.fit.result import Comparison, Points, as_read
from tracer.plots.curves import Curve, draw_band, draw_legend, legend_height, release_curve
from tracer.plots.field import Field
from tracer.plots.log_range import log_range
from tracer.plots.log_ticks import set_log_ticks
from tracer.plots.style import TEXT_SIZE, WIDTHS, Box, Width, axes_in, line_height, styled
from tracer.plots.words import broken, framed_figure

LEFT, RIGHT, TOP, BOTTOM, BETWEEN, LEGEND_GAP = 16.5, 4.0, 2.0, 10.0, 2.0, 1.0
HEIGHTS: dict[Width, float] = {"column": 52.0, "full": 72.0}
RESIDUAL_HEIGHT = 20.0
"""Distances [mm] round the panels, and their heights."""
LOG_SPAN = 8.0
"""Ratio of largest to smallest value above which the axis is logarithmic."""
LEAST_PART = 0.1
"""Parts of the model are shown down to this share of the smallest value."""
LIMIT_COLOUR, POINT_SIZE, CAP = "0.35", 2.2, 1.2
FEWEST_SIGMAS = 3.5
"""Least height of the panel of residuals, in standard errors."""
DATA, LIMITS, MODEL, BACKGROUND = "measured", "upper limits", "model", "background"

Floats = NDArray[np.float64]


def comparison(found: Comparison, width: Width = "full") -> Figure:
    """Return the figure of a comparison: data, model with its error, parts; and residuals below.

    Parameters
    ----------
    found : Comparison
        As `tracer.compare` gives it.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal.
    """
    points = found.points
    order = np.argsort(points.position, kind="stable")
    looks = _looks(found)
    named = [*_point_looks(points), *looks]
    legend = legend_height(named, width) + LEGEND_GAP
    heights, across = (HEIGHTS[width], RESIDUAL_HEIGHT), WIDTHS[width] - LEFT - RIGHT
    label = broken(f"{points.position_words} ({_unit_words(points.position_unit)})", across, TEXT_SIZE, 2)
    bottom = BOTTOM + (len(label) - 1) * line_height(TEXT_SIZE)
    with styled():
        figure, box = framed_figure(
            width,
            TOP + sum(heights) + BETWEEN + bottom + legend,
            found.title,
            _subtitle(found),
            _caption(found),
        )
        foot = box.bottom + legend + bottom
        upper = axes_in(figure, Box(LEFT, foot + heights[1] + BETWEEN, across, heights[0]))
        lower = axes_in(figure, Box(LEFT, foot, across, heights[1]))
        _draw_profile(upper, points, order, looks, found.what)
        _draw_residuals(lower, points)
        for axes in (upper, lower):
            axes.set_xlim(*_limits(points.position))
            axes.grid(color="0.92", linewidth=0.4)
            axes.set_axisbelow(True)
        upper.tick_params(labelbottom=False)
        lower.set_xlabel("\n".join(label))
        draw_legend(figure, named, width, box.bottom + legend - LEGEND_GAP)
    return figure


def _looks(found: Comparison) -> list[Curve]:
    parts = [release_curve(number, name) for number, name in enumerate(found.points.parts)]
    looks = [Curve(MODEL, "black", "-", 1.2), *parts]
    return [*looks, Curve(BACKGROUND, "0.5", (0.0, (2.0, 2.0)))] if found.points.background.any() else looks


def _point_looks(points: Points) -> list[Curve]:
    limits = [Curve(LIMITS, LIMIT_COLOUR, "none", marker="v")] if points.upper.any() else []
    return [Curve(DATA, "black", "none", marker="o"), *limits]


def _draw_profile(
    axes: Axes, points: Points, order: NDArray[np.int64], looks: Sequence[Curve], what: str
) -> None:
    x = points.position[order]
    curves = {MODEL: Field(points.model[order], points.model_error[order])}
    curves |= {name: Field(part[order], np.full(len(x), np.nan)) for name, part in points.parts.items()}
    curves[BACKGROUND] = Field(points.background[order], np.full(len(x), np.nan))
    span = _log_span(points)
    for look in looks:
        draw_band(axes, x, curves[look.name], look)
    measured = ~points.upper
    axes.errorbar(
        points.position[measured],
        points.value[measured],
        points.sigma[measured],
        fmt="o",
        color="black",
        markersize=POINT_SIZE,
        elinewidth=0.5,
        capsize=CAP,
        capthick=0.5,
        zorder=4.0,
        gid=DATA,
    )
    axes.plot(
        points.position[points.upper],
        points.value[points.upper],
        linestyle="none",
        marker="v",
        color=LIMIT_COLOUR,
        markersize=3.0,
        zorder=4.0,
        gid=LIMITS,
    )
    axes.set_ylabel(f"{what.capitalize() if what.islower() else what} ({_unit_words(points.unit)})")
    if span is not None:
        axes.set(yscale="log", ylim=span)
        set_log_ticks(axes.yaxis, *span)
    else:
        axes.axhline(0.0, color="0.7", linewidth=0.4, zorder=0.5)


def _log_span(points: Points) -> tuple[float, float] | None:
    """Return limits of a logarithmic axis; None where the values call for a straight one."""
    values = points.value
    if not np.all(values > 0.0) or values.max() < LOG_SPAN * values.min():
        return None
    parts = np.concatenate([np.asarray(part) for part in (points.background, *points.parts.values())])
    shown = np.concatenate([values, values + points.sigma, parts[parts > LEAST_PART * values.min()]])
    return log_range([Field(shown, np.zeros(len(shown)))])


def _draw_residuals(axes: Axes, points: Points) -> None:
    shown = points.residual[~points.upper]
    axes.plot(points.position[~points.upper], shown, "o", color="black", markersize=POINT_SIZE)
    axes.plot(
        points.position[points.upper], points.residual[points.upper], "v", color=LIMIT_COLOUR, markersize=3.0
    )
    axes.axhline(0.0, color="0.4", linewidth=0.6)
    for height in (-1.0, 1.0):
        axes.axhline(height, color="0.7", linewidth=0.4, linestyle="--")
    most = max(FEWEST_SIGMAS, 1.15 * float(np.max(np.abs(shown))))
    axes.set(ylim=(-most, most), ylabel="Residual\n(sigma)")


def _limits(positions: Floats) -> tuple[float, float]:
    low, high = float(positions.min()), float(positions.max())
    room = 0.03 * (high - low) or 0.5
    return low - room, high + room


def _subtitle(found: Comparison) -> str:
    return (
        f"{found.view}; chi-square {found.chi_square:.4g} for {found.degrees_of_freedom} degrees of freedom, "
        f"probability {found.probability:.2g}"
    )


def _caption(found: Comparison) -> str:
    rates = ", ".join(
        f"{name} {one.best:.3g} s-1 ({one.low68:.3g} to {one.high68:.3g})"
        for name, one in found.rates.items()
    )
    words = [f"Rates with their 68 % ranges: {rates}."] if rates else []
    for name, parameters in found.parameters.items():
        for key, one in parameters.items():
            read, unit = as_read(key, one)
            ends = f"{read.low68:.4g} to {read.high68:.4g}"
            words.append(f"{name}, {key.replace('_', ' ')}: {read.best:.4g} {unit} ({ends}).")
    if found.range_ends.draws:
        words.append(f"Ranges are calibrated on {found.range_ends.draws} profiles drawn about each end.")
    words.append("Band: one standard error of the model, Monte Carlo and bins of launch speed.")
    return " ".join(words)


def _unit_words(unit: str) -> str:
    return {"radii": "body radii", "cm-2": "cm$^{-2}$", "m-2": "m$^{-2}$"}.get(unit, unit)
