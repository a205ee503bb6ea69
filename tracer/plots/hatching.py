"""Hatches over cells without significance."""

from collections.abc import Iterable, Iterator

import numpy as np
from matplotlib.axes import Axes
from matplotlib.patches import PathPatch
from matplotlib.path import Path
from numpy.typing import NDArray

from tracer.plots.style import HATCH, HATCH_COLOUR

HATCHED = "hatched cells"
"""Name of the artist that holds the hatches."""


def runs(cells: NDArray[np.bool_]) -> Iterator[tuple[int, int, int]]:
    """Yield row, first column and end column of each unbroken run of true cells in a row."""
    rows = np.pad(cells, ((0, 0), (1, 1))).astype(np.int8)
    for row, steps in enumerate(np.diff(rows, axis=1)):
        firsts, ends = np.flatnonzero(steps == 1), np.flatnonzero(steps == -1)
        for first, end in zip(firsts.tolist(), ends.tolist(), strict=True):
            yield row, first, end


def hatch(axes: Axes, outlines: Iterable[NDArray[np.float64]]) -> None:
    """Hatch the areas inside closed `outlines`, each of shape (corners, 2), as one artist."""
    paths = [Path(outline, closed=True) for outline in outlines]
    if paths:
        axes.add_patch(
            PathPatch(
                Path.make_compound_path(*paths),
                facecolor="none",
                edgecolor=HATCH_COLOUR,
                linewidth=0.0,
                hatch=HATCH,
                gid=HATCHED,
                zorder=2.0,
            )
        )


def hatch_rectangles(
    axes: Axes, columns: NDArray[np.float64], rows: NDArray[np.float64], cells: NDArray[np.bool_]
) -> None:
    """Hatch the true `cells`, shape (R, C), of a grid with edges `columns` (C + 1) and `rows` (R + 1)."""
    hatch(
        axes,
        (
            _rectangle(columns[first], columns[end], rows[row], rows[row + 1])
            for row, first, end in runs(cells)
        ),
    )


def _rectangle(left: float, right: float, low: float, high: float) -> NDArray[np.float64]:
    return np.array([(left, low), (right, low), (right, high), (left, high), (left, low)])
