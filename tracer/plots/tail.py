"""Figure: how the gas thins out along the tail of an image."""

from collections.abc import Sequence
from math import hypot
from typing import NamedTuple

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.plots.body import ON_AXIS, sun_in_sky
from tracer.plots.curves import Curve, draw_band, draw_legend, legend_height, release_curve, sum_curve
from tracer.plots.field import released_words, releases
from tracer.plots.lengths import body_radius, kilometres_across
from tracer.plots.log_range import log_range
from tracer.plots.log_ticks import set_log_ticks
from tracer.plots.planes import edges
from tracer.plots.seen import of_line, seen_in
from tracer.plots.significance import say_nothing
from tracer.plots.sky import Sky, sky_of
from tracer.plots.style import DAY_COLOUR, NIGHT_COLOUR, SMALL_SIZE, WIDTHS, Box, Width, axes_in, styled
from tracer.plots.sums import NO_REPLICATES, has_replicates, summed
from tracer.plots.words import framed_figure
from tracer.product.layout import image_dimensions

LEFT, RIGHT, TOP, BOTTOM, LEGEND_GAP = 16.5, 4.0, 7.0, 10.0, 1.0
HEIGHTS: dict[Width, float] = {"column": 58.0, "full": 80.0}
"""Distances [mm] round the panel, and its height."""
HALF_WIDTH = 1.0
"""Half width of the strip along the axis, in body radii."""
FULL_BIN = 0.6
"""Pixels that a bin must have, over those of most bins."""
STRIP = 0.04
"""Height of the strip of day and night, over the panel's."""

BAND_WORDS = "Bands: one standard error of the Monte Carlo sampling, from the replicates."
SLANTED = 1e-3
"""Cosine between line of sight and the Sun above which distances in the sky are visibly shorter than in space."""


class Strip(NamedTuple):
    """Pixels along the tail axis: edges (N + 1) of the bins downtail and half width, both in body radii.

    `pixels` (P,) are the flat places of the pixels in the strip, in the order of their bins; `first` (M,) is where in
    them a bin begins, `bins` (M,) which bin, `counts` (M,) how many it has.
    """

    edges: NDArray[np.float64]
    half_width: float
    pixels: NDArray[np.int64]
    first: NDArray[np.int64]
    bins: NDArray[np.int64]
    counts: NDArray[np.int64]

    @property
    def middles(self) -> NDArray[np.float64]:
        """Middles of the bins that hold pixels, in body radii."""
        return np.asarray(0.5 * (self.edges[1:] + self.edges[:-1])[self.bins])

    @property
    def words(self) -> str:
        """The half width, as a text says it."""
        number = f"{self.half_width:.3g}"
        return f"{number} body {'radius' if number == '1' else 'radii'}"

    def means(self, images: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the means (..., M) of images (..., rows, columns) over the pixels of each bin."""
        flat = images.reshape(*images.shape[:-2], -1)[..., self.pixels]
        return np.asarray(np.add.reduceat(flat, self.first, axis=-1) / self.counts)


def tail(
    product: xr.Dataset,
    name: str | None = None,
    line: str | None = None,
    release: str | None = None,
    width: Width = "full",
) -> Figure:
    """Return what an image shows along its tail axis, from the Sun's side to behind the body, by release.

    Each point is the mean over pixels within one radius of the axis.

    Parameters
    ----------
    product : xarray.Dataset
        As `open_product` gives it; without replicates there are no bands.
    name : str, optional
        The image, by its name in the product or in the run file; may be absent where there is only one.
    line : str, optional
        Emission line: the brightness in it is drawn [kR]; column density [cm-2] if absent.
    release : str, optional
        Name of the release to draw; all of them and their sum if absent.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal.

    Raises
    ------
    InputError
        Where the product has no such image, line or release, the image shows no part of the tail axis, or its viewer
        stands on that axis.
    """
    radius, sky, names = body_radius(product), sky_of(product, name), releases(product, release)
    strip = strip_of(product, sky, radius)
    source, seen = of_line(product, line), seen_in(sky, line)
    lines = [
        (look, summed(source, seen.variable, chosen, strip.means, seen.factor))
        for look, chosen in _choices(product, names)
    ]
    looks, fields = [look for look, _ in lines], [field for _, field in lines]
    with styled():
        figure, box = framed_figure(
            width,
            TOP + HEIGHTS[width] + BOTTOM + legend_height(looks, width) + LEGEND_GAP,
            str(product.attrs.get("title", "")),
            f"{sky.title}: {seen.what} along the tail axis, {released_words(names)}",
            _caption(strip, sky, has_replicates(source, seen.variable)),
        )
        legend = box.bottom + legend_height(looks, width)
        across = WIDTHS[width] - LEFT - RIGHT
        axes = axes_in(figure, Box(LEFT, legend + LEGEND_GAP + BOTTOM, across, HEIGHTS[width]))
        span = log_range(fields)
        _set_axes(axes, span, strip, seen.label, radius)
        for look, field in lines:
            draw_band(axes, strip.middles, field, look)
        if span is None:
            say_nothing(axes, 0.5)
        draw_legend(figure, looks, width, legend)
    return figure


def strip_of(product: xr.Dataset, sky: Sky, radius: float) -> Strip:
    """Return the pixels of an image along the axis from the Sun through the body, by their distance downtail.

    Raises
    ------
    InputError
        Where the viewer stands on the axis, or the image shows none of it.
    """
    if hypot(sky.right[0], sky.up[0]) < ON_AXIS:
        raise InputError(f'image "{sky.name}" looks along the tail: it has no tail axis in its sky')
    toward_sun = sun_in_sky(sky.up, sky.right)
    vertical, horizontal = (edges(product, axis) / radius for axis in image_dimensions(sky.name))
    right, up = 0.5 * (horizontal[1:] + horizontal[:-1]), 0.5 * (vertical[1:] + vertical[:-1])
    downtail = -(right * toward_sun[0] + up[:, np.newaxis] * toward_sun[1]).ravel()
    aside = np.abs(right * toward_sun[1] - up[:, np.newaxis] * toward_sun[0]).ravel()
    # A bin is as long as a pixel along the axis, and the strip at least as wide as one across it.
    pixel = np.array([horizontal[1] - horizontal[0], vertical[1] - vertical[0]])
    along, across = float(pixel @ np.abs(toward_sun)), float(pixel @ np.abs(toward_sun[::-1]))
    half_width = max(HALF_WIDTH, 0.5 * across)
    inside = np.flatnonzero(aside <= half_width * (1.0 + 1e-9))
    if not inside.size:
        raise InputError(f'image "{sky.name}" shows no part of the tail axis')
    low = float(downtail.min()) - 0.5 * along
    number = np.floor((downtail[inside] - low) / along + 1e-9).astype(np.int64)
    order = np.argsort(number, kind="stable")
    _, place, counts = np.unique(number[order], return_inverse=True, return_counts=True)
    # Where an image's rim cuts the strip aslant, its last bins hold but a part of its width.
    kept = FULL_BIN * np.median(counts) <= counts[place]
    chosen = number[order][kept]
    bins, first, counts = np.unique(chosen, return_index=True, return_counts=True)
    ends = low + along * np.arange(int(chosen.max()) + 2, dtype=np.float64)
    return Strip(ends, half_width, inside[order][kept], first, bins, counts)


def _choices(product: xr.Dataset, names: Sequence[str]) -> list[tuple[Curve, list[str]]]:
    every = releases(product, None)
    chosen = [(release_curve(every.index(name), name), [name]) for name in names]
    return [*chosen, (sum_curve(), list(names))] if len(names) > 1 else chosen


def _caption(strip: Strip, sky: Sky, errors: bool) -> str:
    words = [f"Means within {strip.words} of the axis."]
    if abs(sky.toward_viewer[0]) > SLANTED:
        words.append("Distances are those in the sky, shorter than in space.")
    words.append(BAND_WORDS if errors else NO_REPLICATES)
    return " ".join(words)


def _set_axes(axes: Axes, span: tuple[float, float] | None, strip: Strip, label: str, radius: float) -> None:
    axes.set(
        yscale="log",
        xlim=(strip.edges[strip.bins[0]], strip.edges[-1]),
        ylim=span or (1.0, 10.0),
        xlabel="Downtail distance from the body's centre (body radii)",
        ylabel=label,
    )
    set_log_ticks(axes.yaxis, *axes.get_ylim())
    axes.grid(color="0.92", linewidth=0.4)
    axes.set_axisbelow(True)
    kilometres_across(axes, radius)
    _draw_body(axes)


def _draw_body(axes: Axes) -> None:
    """Mark where the axis runs over the body's disc: day side, night side."""
    places = axes.get_xaxis_transform()
    low, high = axes.get_xlim()
    for start, end, colour in ((-1.0, 0.0, DAY_COLOUR), (0.0, 1.0, NIGHT_COLOUR)):
        left, right = max(start, low), min(end, high)
        if left < right:
            axes.axvspan(left, right, color=colour, alpha=0.35, linewidth=0.0, zorder=0.5)
            axes.fill_between(
                [left, right], 0.0, STRIP, transform=places, color=colour, linewidth=0.0, zorder=3.0
            )
    for words, x, inside, side in (
        ("\N{LEFTWARDS ARROW} Sun", 0.01, low < -1.0, "left"),
        ("tail \N{RIGHTWARDS ARROW}", 0.99, high > 1.0, "right"),
    ):
        if inside:
            axes.text(
                x, 0.985, words, transform=axes.transAxes, ha=side, va="top", fontsize=SMALL_SIZE, color="0.3"
            )
