"""Figure: the particle budget, release by release: what share of the atoms ends how, and at which rates."""

from math import ceil
from typing import Any, NamedTuple

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D

from tracer.plots.budget import ALL, EXACT, Budget, budget_of, look, scientific, share_words
from tracer.plots.field import releases
from tracer.plots.log_ticks import set_log_ticks
from tracer.plots.significance import say_nothing
from tracer.plots.style import (
    MILLIMETRES_PER_INCH,
    MILLIMETRES_PER_POINT,
    SMALL_SIZE,
    WIDTHS,
    Box,
    Width,
    axes_in,
    styled,
)
from tracer.plots.words import LETTER_WIDTH, MARGIN, broken, framed_figure, plain

LEFT, RIGHT, TOP, BOTTOM = 27.0, 5.0, 2.0, 10.0
BETWEEN_BESIDE, BETWEEN_STACKED = 7.0, 11.0
LEGEND_ROW = 3.4
ROW, LOW_ROW = 10.0, 4.5
"""Distances [mm] round and between the panels; height of the legend's rows and of a release's row, where there
are few and where there are many."""
FEW_RELEASES = 12
BAR_THICKNESS = 0.62
SPREAD = 0.6
"""Thickness of a bar and spread of the markers of a release, over the height of its row."""
MOST_DECADES = 6.0
"""Decades of rates shown below the largest; what is less does not matter to a budget."""
ERROR_WORDS = (
    "Error bars and \N{PLUS-MINUS SIGN}: one standard error of the Monte Carlo sampling; "
    "that of a share stands at its end."
)
SUM_WORDS = " All releases: they are independent, their variances add."
ERROR_BARS: dict[str, Any] = {"ecolor": "black", "elinewidth": 0.6, "capsize": 1.5, "capthick": 0.6}


class Share(NamedTuple):
    """A piece of a bar [%]: share, standard error, where it ends, what room it has for text."""

    value: float
    error: float
    end: float
    free: float


def ledger(product: xr.Dataset, release: str | None = None, width: Width = "full") -> Figure:
    """Return the particle budget: bars of shares, and rates with one standard error.

    Parameters
    ----------
    product : xarray.Dataset
        As `open_product` gives it.
    release : str, optional
        Name of the release to draw; all of them and their sum if absent.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal; shares and rates stand above or
        beside each other.

    Raises
    ------
    InputError
        Where the product has no such release.
    """
    budget = budget_of(product, releases(product, release))
    caption = ERROR_WORDS + (SUM_WORDS if budget.names[-1] == ALL else "")
    with styled():
        caption += _roulette_words(budget)
        figure, panels = _lay_out(width, str(product.attrs.get("title", "")), caption, budget)
        for axes, draw in zip(panels, (_draw_shares, _draw_rates), strict=True):
            draw(axes, budget)
            _name_rows(axes, budget, width == "column" or axes is panels[0])
            if not budget.fates:
                say_nothing(axes, 0.5)
    return figure


def _roulette_words(budget: Budget) -> str:
    """Return what roulette did to the sum of the last row, empty where nothing."""
    balance, released = float(budget.balance[-1]), float(budget.released[-1])
    if balance == 0.0 or not released > 0.0:
        return ""
    added = f"{100.0 * balance / released:+.2g}".replace("-", "−")
    return f" Roulette with atoms of small weight added {added} % to the released, by chance."


def _lay_out(width: Width, title: str, caption: str, budget: Budget) -> tuple[Figure, list[Axes]]:
    """Return the figure with its legend and two panels: side by side, or stacked in a column."""
    beside = width == "full"
    rows = len(budget.names)
    height = rows * (ROW if rows <= FEW_RELEASES else LOW_ROW)
    across = WIDTHS[width] - LEFT - RIGHT
    columns = 6 if beside else 3
    legend = LEGEND_ROW * ceil(len(budget.fates) / columns)
    stack = height if beside else 2.0 * height + BETWEEN_STACKED
    figure, box = framed_figure(width, TOP + legend + stack + BOTTOM, title, "Particle budget", caption)
    low = box.bottom + BOTTOM
    if beside:
        across = 0.5 * (across - BETWEEN_BESIDE)
        places = [Box(LEFT, low, across, height), Box(LEFT + across + BETWEEN_BESIDE, low, across, height)]
    else:
        places = [Box(LEFT, low + height + BETWEEN_STACKED, across, height), Box(LEFT, low, across, height)]
    _draw_legend(figure, budget, columns, box.bottom + box.height)
    return figure, [axes_in(figure, place) for place in places]


def _draw_legend(figure: Figure, budget: Budget, columns: int, top: float) -> None:
    if not budget.fates:
        return
    width, height = figure.get_size_inches() * MILLIMETRES_PER_INCH
    figure.legend(
        handles=[
            Line2D([], [], linestyle="none", marker=fate.marker, color=fate.colour, label=fate.words)
            for fate in map(look, budget.fates)
        ],
        loc="upper left",
        bbox_to_anchor=((LEFT - 2.0 if columns > 3 else MARGIN) / width, (top - 0.5) / height),
        ncols=columns,
        frameon=False,
        markerscale=0.8,
        borderpad=0.0,
        borderaxespad=0.0,
        handletextpad=0.2,
        columnspacing=1.2,
    )


def _draw_shares(axes: Axes, budget: Budget) -> None:
    total = budget.rate.sum(axis=1)
    for row in np.flatnonzero(total > 0.0).tolist():
        share, error = 100.0 * (budget.rate[row] / total[row]), 100.0 * (budget.error[row] / total[row])
        ends = np.cumsum(share)
        # A text stands between the error bars at both ends of its piece.
        free = share - np.nan_to_num(error) - np.nan_to_num(np.append(0.0, error[:-1]))
        for index, fate in enumerate(budget.fates):
            _draw_share(axes, row, fate, Share(*(float(part[index]) for part in (share, error, ends, free))))
    axes.set(xlim=(0.0, 100.0), xlabel="Share of released atoms (%)")


def _draw_share(axes: Axes, row: int, fate: str, share: Share) -> None:
    shown, middle = look(fate), share.end - 0.5 * share.value
    axes.barh(row, share.value, BAR_THICKNESS, share.end - share.value, color=shown.colour, linewidth=0.0)
    if share.error > EXACT * share.value:
        axes.errorbar(share.end, row, xerr=share.error, fmt="none", **ERROR_BARS)
    width = axes.get_position().width * axes.figure.bbox.width / axes.figure.dpi * MILLIMETRES_PER_INCH
    # One letter of room at either end.
    letters = 0.01 * share.free * width / (LETTER_WIDTH * SMALL_SIZE * MILLIMETRES_PER_POINT) - 2.0
    axes.text(
        middle,
        row,
        share_words(share.value, share.error, letters),
        color=shown.ink,
        ha="center",
        va="center",
        fontsize=SMALL_SIZE,
    )


def _draw_rates(axes: Axes, budget: Budget) -> None:
    happened = budget.rate[budget.rate > 0.0]
    largest, least = (float(happened.max()), float(happened.min())) if happened.size else (1.0, 1.0)
    axes.set_xscale("log")
    low, high = 0.4 * max(least, largest * 10.0**-MOST_DECADES), 2.5 * largest
    axes.set(xlim=(min(low, 0.1 * high), high), xlabel="Rate (s$^{-1}$)")
    set_log_ticks(axes.xaxis, *axes.get_xlim())
    offsets = SPREAD * ((np.arange(len(budget.fates)) + 0.5) / max(len(budget.fates), 1) - 0.5)
    rows = np.arange(len(budget.names))
    for fate, shown in enumerate(map(look, budget.fates)):
        met = budget.rate[:, fate] > 0.0
        axes.errorbar(
            budget.rate[met, fate],
            rows[met] + offsets[fate],
            xerr=np.nan_to_num(budget.error[met, fate]),
            fmt=shown.marker,
            color=shown.colour,
            markersize=3.5,
            **ERROR_BARS,
        )
    axes.grid(axis="x", color="0.9", linewidth=0.4)
    axes.set_axisbelow(True)
    for row in rows[1:].tolist():
        axes.axhline(row - 0.5, color="0.8", linewidth=0.4)


def _name_rows(axes: Axes, budget: Budget, named: bool) -> None:
    rows = len(budget.names)
    axes.set_ylim(rows - 0.5, -0.5)
    axes.set_yticks(range(rows))
    axes.tick_params(axis="y", length=0.0)
    lines = 2 if rows <= FEW_RELEASES else 1
    labels = []
    for name, rate in zip(budget.names, budget.released.tolist(), strict=True):
        words = [plain(line) for line in broken(name, LEFT - 2.0, SMALL_SIZE, lines)]
        labels.append("\n".join([*words, f"{scientific(rate)} s$^{{-1}}$"] if lines > 1 else words))
    axes.set_yticklabels(labels if named else [])
