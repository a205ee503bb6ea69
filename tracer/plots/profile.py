"""Figure: number density against altitude, by day and by night, with errors and the thermal curve."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.axes._secondary_axes import SecondaryAxis
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter
from numpy.typing import NDArray

from tracer.plots.curves import (
    Curve,
    draw_legend,
    draw_stairs,
    legend_height,
    release_curve,
    sum_curve,
)
from tracer.plots.field import Field, released_words, releases
from tracer.plots.ground_map import DAWN, DUSK, TURN
from tracer.plots.lengths import KILOMETRE, body_radius, scaling
from tracer.plots.log_range import log_range
from tracer.plots.log_ticks import set_log_ticks
from tracer.plots.planes import edges
from tracer.plots.reading_units import PER_CUBIC_CENTIMETRE
from tracer.plots.significance import say_nothing
from tracer.plots.style import WIDTHS, Box, Width, axes_in, styled
from tracer.plots.sums import NO_REPLICATES, has_replicates, summed
from tracer.plots.thermal_curve import ThermalCurve, thermal_curve
from tracer.plots.words import framed_figure
from tracer.product.layout import ALTITUDE, LATITUDE, LOCAL_TIME

LEFT, RIGHT, TOP, BOTTOM = 13.5, 12.5, 4.5, 10.0
HEIGHT, BETWEEN_BESIDE, BETWEEN_STACKED = 62.0, 5.0, 6.0
LEGEND_GAP = 1.0
"""Distances [mm] round and between the panels, and their height."""
LOWEST_SHOWN = 0.5
"""Where the axis of altitude begins, over the top of the lowest cell; that cell reaches down to the ground."""
THERMAL = Curve("Chamberlain (1963)", "black", (0.0, (2.0, 1.0)), 0.7)
POINTS = 200

BAND_WORDS = "Bands: one standard error of the Monte Carlo sampling, from the replicates."
MEAN_WORDS = "Means over the volume of each layer; the lowest reaches the ground."
THERMAL_WORDS = (
    "Chamberlain (1963): ballistic and escaping atoms above an even thermal ground, without an outer radius."
)


class Side(NamedTuple):
    """A half of the body: title of its panel, and local times [h] that it holds."""

    title: str
    spans: tuple[tuple[float, float], ...]


SIDES = (
    Side("(a) day side, 6 h to 18 h", ((DAWN, DUSK),)),
    Side("(b) night side, 18 h to 6 h", ((0.0, DAWN), (DUSK, TURN))),
)


class Line(NamedTuple):
    """A curve by its look, its values on both sides [cm-3], and the thermal curve where there is one."""

    look: Curve
    sides: tuple[Field, ...]
    thermal: ThermalCurve | None


def profile(product: xr.Dataset, release: str | None = None, width: Width = "full") -> Figure:
    """Return number density [cm-3] against altitude, means over the day side and the night side.

    Every release has its line with a band of one standard error, and so has their sum. Where a release makes
    Chamberlain's exosphere its curve is drawn too.

    Parameters
    ----------
    product : xarray.Dataset
        As `open_product` gives it; without replicates there are no bands.
    release : str, optional
        Name of the release to draw; all of them and their sum if absent.
    width : "column" or "full"
        Width of the figure; day and night stand above or beside each other.

    Raises
    ------
    InputError
        Where the product has no such release.
    """
    names, radius = releases(product, release), body_radius(product)
    lines = _lines(product, names, radius)
    altitudes = edges(product, ALTITUDE)
    looks = [line.look for line in lines]
    if any(line.thermal for line in lines):
        looks.append(THERMAL)
    with styled():
        figure, panels, foot = _lay_out(width, product, looks, _caption(product, lines), names)
        span = log_range([side for line in lines for side in line.sides])
        for index, axes in enumerate(panels):
            in_radii = _set_axes(axes, span, altitudes, radius)
            for line in lines:
                draw_stairs(axes, _shown(altitudes) / KILOMETRE, line.sides[index], line.look)
                if line.thermal is not None:
                    _draw_thermal(axes, line.thermal, altitudes, radius)
            axes.set_title(SIDES[index].title, loc="left", pad=3.0)
            if span is None:
                say_nothing(axes, 0.5)
            _label(axes, in_radii, width, index)
        draw_legend(figure, looks, width, foot)
    return figure


def _lines(product: xr.Dataset, names: Sequence[str], radius: float) -> list[Line]:
    every = releases(product, None)
    lines = []
    for name in names:
        sides = tuple(_mean(product, [name], side) for side in SIDES)
        look = release_curve(every.index(name), name)
        lines.append(Line(look, sides, thermal_curve(product, name, radius)))
    if len(names) > 1:
        lines.append(Line(sum_curve(), tuple(_mean(product, names, side) for side in SIDES), None))
    return lines


def _mean(product: xr.Dataset, names: Sequence[str], side: Side) -> Field:
    """Return the mean over the volume of each layer on one side; a cell across its edge counts with its part."""
    ends = edges(product, LOCAL_TIME)
    low, high = ends[:-1], ends[1:]
    inside = [(np.minimum(high, end) - np.maximum(low, start)).clip(min=0.0) for start, end in side.spans]
    share = np.sum(inside, axis=0) / (high - low)
    volume = product["cell_volume"].transpose(ALTITUDE, LATITUDE).values[:, :, np.newaxis] * share
    weights = volume / volume.sum(axis=(1, 2), keepdims=True)
    return summed(
        product,
        "number_density",
        names,
        lambda cells: np.einsum("...alh,alh->...a", cells, weights),
        PER_CUBIC_CENTIMETRE,
    )


def _caption(product: xr.Dataset, lines: Sequence[Line]) -> str:
    words = [MEAN_WORDS, BAND_WORDS if has_replicates(product, "number_density") else NO_REPLICATES]
    if any(line.thermal for line in lines):
        words.append(THERMAL_WORDS)
    return " ".join(words)


def _lay_out(
    width: Width, product: xr.Dataset, looks: Sequence[Curve], caption: str, names: Sequence[str]
) -> tuple[Figure, list[Axes], float]:
    """Return the figure, its two panels, and where [mm] the legend's upper edge is."""
    beside = width == "full"
    across = WIDTHS[width] - LEFT - RIGHT
    stack = HEIGHT if beside else 2.0 * HEIGHT + BETWEEN_STACKED
    legend = legend_height(looks, width) + LEGEND_GAP
    title = str(product.attrs.get("title", ""))
    subtitle = f"Number density against altitude, {released_words(names)}"
    figure, box = framed_figure(width, TOP + stack + BOTTOM + legend, title, subtitle, caption)
    low = box.bottom + legend + BOTTOM
    if beside:
        across = 0.5 * (across - BETWEEN_BESIDE)
        places = [Box(LEFT, low, across, HEIGHT), Box(LEFT + across + BETWEEN_BESIDE, low, across, HEIGHT)]
    else:
        places = [Box(LEFT, low + HEIGHT + BETWEEN_STACKED, across, HEIGHT), Box(LEFT, low, across, HEIGHT)]
    return figure, [axes_in(figure, place) for place in places], box.bottom + legend - LEGEND_GAP


def _shown(altitudes: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the edges of altitude with the ground moved up to where the axis begins."""
    return np.append(LOWEST_SHOWN * altitudes[1], altitudes[1:])


def _set_axes(
    axes: Axes, span: tuple[float, float] | None, altitudes: NDArray[np.float64], radius: float
) -> SecondaryAxis:
    """Set scales and ticks, and return the axis of body radii at the right."""
    low, high = LOWEST_SHOWN * altitudes[1] / KILOMETRE, altitudes[-1] / KILOMETRE
    axes.set(xscale="log", yscale="log", xlim=span or (1.0, 10.0), ylim=(low, high))
    axes.grid(color="0.92", linewidth=0.4)
    axes.set_axisbelow(True)
    set_log_ticks(axes.xaxis, *axes.get_xlim())
    if high > 10.0 * low:
        set_log_ticks(axes.yaxis, low, high)
    plain_numbers = FuncFormatter(lambda x, _: f"{x:g}")
    if low > 0.02 and high < 1e5:
        axes.yaxis.set_major_formatter(plain_numbers)
    factor = KILOMETRE / radius
    side = axes.secondary_yaxis("right", functions=scaling(factor))
    if high > 10.0 * low:
        set_log_ticks(side.yaxis, low * factor, high * factor)
    side.yaxis.set_major_formatter(plain_numbers)
    return side


def _draw_thermal(axes: Axes, curve: ThermalCurve, altitudes: NDArray[np.float64], radius: float) -> None:
    heights = np.geomspace(LOWEST_SHOWN * altitudes[1], altitudes[-1], POINTS)
    density = curve.density(1.0 + heights / radius) * PER_CUBIC_CENTIMETRE
    axes.plot(
        density,
        heights / KILOMETRE,
        color=THERMAL.colour,
        linestyle=THERMAL.dashes,
        linewidth=THERMAL.width,
        zorder=3.0,
    )


def _label(axes: Axes, in_radii: SecondaryAxis, width: Width, index: int) -> None:
    first, last = index == 0, index == len(SIDES) - 1
    if width == "column" or first:
        axes.set_ylabel("Altitude (km)")
    else:
        axes.tick_params(labelleft=False)
    if width == "column" or last:
        in_radii.set_ylabel("Altitude (body radii)")
    else:
        in_radii.tick_params(labelright=False)
    if width == "full" or last:
        axes.set_xlabel("Number density (cm$^{-3}$)")
    else:
        axes.tick_params(labelbottom=False)
