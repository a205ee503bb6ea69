"""What a figure says about cells without significance and about its errors."""

from collections.abc import Sequence

from matplotlib.axes import Axes

from tracer.plots.field import Field
from tracer.plots.style import TEXT_SIZE

HATCHED_WORDS = "Hatched: standard error above half of the value, or {nothing}."
SUM_WORDS = "Errors of the sum: releases are independent, their variances add."
NOTHING = "nothing counted"
"""Words on a panel without a single value."""


def note(fields: Sequence[Field], names: Sequence[str], nothing: str = "no atom counted") -> str:
    """Return the caption's line about hatches and sums, as far as this figure has them."""
    words = []
    if any(not one.significant.all() for one in fields):
        words.append(HATCHED_WORDS.format(nothing=nothing))
        if len(names) > 1:
            words.append(SUM_WORDS)
    return " ".join(words)


def say_nothing(axes: Axes, height: float = 0.8) -> None:
    """Write at `height`, from 0 to 1, of a panel that it has nothing to show."""
    axes.text(
        0.5,
        height,
        NOTHING,
        transform=axes.transAxes,
        ha="center",
        va="center",
        fontsize=TEXT_SIZE,
        bbox={"facecolor": "white", "edgecolor": "0.6", "linewidth": 0.5, "pad": 3.0},
        zorder=6.0,
    )
