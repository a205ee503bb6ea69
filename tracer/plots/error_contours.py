"""Contours of relative standard error over an image."""

import numpy as np
from matplotlib.axes import Axes
from matplotlib.patheffects import AbstractPathEffect, withStroke
from numpy.typing import NDArray
from scipy.ndimage import median_filter

from tracer.plots.field import LARGEST_RELATIVE_ERROR, Field
from tracer.plots.style import SMALL_SIZE

LEVELS = (0.01, 0.03, 0.1, 0.3)
CONTOURS = "contours of relative standard error"
"""Name of the artist."""
SMOOTHED = 12
"""Pixels across a panel's shorter side over those of the median; single pixels would fray the contours."""
FEWEST = 6
"""Pixels along a side below which there are no contours."""
BEYOND = 2.0 * LARGEST_RELATIVE_ERROR
"""Relative error that stands for any larger one and for pixels without a count."""


def draw_error_contours(
    axes: Axes, columns: NDArray[np.float64], rows: NDArray[np.float64], field: Field
) -> None:
    """Draw contours of the relative standard error of a pixel between edges `columns` and `rows`."""
    relative, levels = _smoothed(field), _levels(field)
    if not levels:
        return
    contours = axes.contour(
        0.5 * (columns[1:] + columns[:-1]),
        0.5 * (rows[1:] + rows[:-1]),
        relative,
        levels=levels,
        colors="white",
        linewidths=0.6,
        zorder=2.4,
    )
    contours.set_gid(CONTOURS)
    halo: list[AbstractPathEffect] = [withStroke(linewidth=1.4, foreground="0.15")]
    contours.set_path_effects(halo)
    for text in axes.clabel(contours, fmt=_percent, fontsize=SMALL_SIZE, inline_spacing=2.0):
        text.set_path_effects(halo)


def contour_words(field: Field) -> str:
    """Return what a caption says about the contours; empty where there are none."""
    if not _levels(field):
        return ""
    window = _window(field)
    median = "" if window == 1 else f", median of {window} \N{MULTIPLICATION SIGN} {window} pixels"
    return f"Contours: relative standard error of a pixel{median}."


def relative_error(field: Field) -> NDArray[np.float64]:
    """Return error over value, at most `BEYOND`, which also stands for pixels without a count."""
    known = field.hit & np.isfinite(field.error)
    ratio = np.divide(field.error, field.value, out=np.full(field.value.shape, BEYOND), where=known)
    return np.asarray(np.minimum(ratio, BEYOND))


def _levels(field: Field) -> list[float]:
    if min(field.value.shape) < FEWEST:
        return []
    smoothed = _smoothed(field)
    return [level for level in LEVELS if smoothed.min() < level < smoothed.max()]


def _smoothed(field: Field) -> NDArray[np.float64]:
    return np.asarray(median_filter(relative_error(field), size=_window(field), mode="nearest"))


def _window(field: Field) -> int:
    return max(1, int(min(field.value.shape)) // SMOOTHED)


def _percent(level: float) -> str:
    return f"{100.0 * level:g} %"
