"""How every figure looks: widths, letters, lines, colours; and figures laid out in millimetres."""

from collections.abc import Iterator
from contextlib import contextmanager
from typing import Literal, NamedTuple

import matplotlib.style
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

Width = Literal["column", "full"]

WIDTHS: dict[Width, float] = {"column": 88.0, "full": 180.0}
"""Width [mm] of one column and of a whole page of a journal; common practice."""

MILLIMETRES_PER_INCH = 25.4
MILLIMETRES_PER_POINT = 25.4 / 72.0

TITLE_SIZE, TEXT_SIZE, SMALL_SIZE = 8.0, 7.0, 6.0
"""Sizes of letters [pt]."""

NUMBER_DENSITY_COLOURS, COLUMN_COLOURS, BRIGHTNESS_COLOURS, FLUX_COLOURS = (
    "cividis",
    "viridis",
    "inferno",
    "magma",
)
SHIFT_COLOURS, WIDTH_COLOURS = "cividis", "viridis"
"""Perceptually uniform colour maps, rising in lightness, so that they survive colour blindness and grey print."""

HATCH, HATCH_COLOUR = "////", "0.62"
DAY_COLOUR, NIGHT_COLOUR = "0.93", "0.25"

SETTINGS: dict[str, object] = {
    "font.family": "DejaVu Sans",
    "mathtext.fontset": "dejavusans",
    "font.size": TEXT_SIZE,
    "axes.titlesize": TEXT_SIZE,
    "axes.labelsize": TEXT_SIZE,
    "axes.labelpad": 2.0,
    "axes.linewidth": 0.5,
    "xtick.labelsize": SMALL_SIZE,
    "ytick.labelsize": SMALL_SIZE,
    "xtick.major.width": 0.5,
    "ytick.major.width": 0.5,
    "xtick.minor.width": 0.4,
    "ytick.minor.width": 0.4,
    "xtick.major.size": 2.5,
    "ytick.major.size": 2.5,
    "xtick.minor.size": 1.5,
    "ytick.minor.size": 1.5,
    "xtick.major.pad": 2.0,
    "ytick.major.pad": 2.0,
    "legend.fontsize": SMALL_SIZE,
    "hatch.linewidth": 0.35,
    "lines.linewidth": 0.8,
    # Text stays text that can be searched and edited; equal products give equal bytes.
    "pdf.fonttype": 42,
    "svg.fonttype": "none",
    "svg.hashsalt": "exosphere-tracer",
}


class Box(NamedTuple):
    """A rectangle on a figure [mm], from the lower left corner."""

    left: float
    bottom: float
    width: float
    height: float


@contextmanager
def styled() -> Iterator[None]:
    """Hold this project's look, whatever the user's own matplotlib settings are, and give those back."""
    with matplotlib.style.context(["default", SETTINGS]):
        yield


def blank_figure(width: float, height: float) -> Figure:
    """Return an empty figure of `width` x `height` [mm] that belongs to no window and no global state."""
    figure = Figure(figsize=(width / MILLIMETRES_PER_INCH, height / MILLIMETRES_PER_INCH))
    FigureCanvasAgg(figure)
    return figure


def axes_in(figure: Figure, box: Box) -> Axes:
    """Return new axes that fill `box` [mm] of the figure."""
    width, height = (size * MILLIMETRES_PER_INCH for size in figure.get_size_inches())
    place = (box.left / width, box.bottom / height, box.width / width, box.height / height)
    return figure.add_axes(place)


def line_height(size: float) -> float:
    """Return the distance [mm] between lines of text of `size` [pt]."""
    return 1.3 * size * MILLIMETRES_PER_POINT
