"""Figure: line shapes in parts of an image, and maps of the mean velocity and the width along the line of sight."""

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.cm import ScalarMappable
from matplotlib.colors import Normalize
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.plots.apertures import Aperture, apertures
from tracer.plots.body import draw_disc, mark_sun
from tracer.plots.colour_scale import POINTS, ROOM_BELOW, bar_below
from tracer.plots.curves import Curve, draw_band, draw_legend, legend_height, release_curve
from tracer.plots.field import Field, listed, released_words, releases
from tracer.plots.hatching import hatch_rectangles
from tracer.plots.host import OUTLINED_WORDS, host_in_sky, outline_host
from tracer.plots.image import direction_words
from tracer.plots.lengths import STEPS, body_radius, kilometres_across, kilometres_up
from tracer.plots.log_range import log_range
from tracer.plots.log_ticks import set_log_ticks
from tracer.plots.planes import edges
from tracer.plots.reading_units import KILOMETRES_PER_SECOND, KILORAYLEIGH, PER_SQUARE_CENTIMETRE
from tracer.plots.significance import say_nothing
from tracer.plots.sky import Sky, shining, sky_of
from tracer.plots.style import (
    SHIFT_COLOURS,
    WIDTH_COLOURS,
    WIDTHS,
    Box,
    Width,
    axes_in,
    styled,
)
from tracer.plots.sums import NO_REPLICATES, has_replicates
from tracer.plots.velocity_sums import Velocities, profiles, velocities_by_pixel, velocities_in
from tracer.plots.words import framed_figure
from tracer.product.layout import image_dimensions, ratio_names, resolved_images, velocity_dimension

LEFT, RIGHT, TOP, BOTTOM, LEGEND_GAP = 16.5, 4.0, 5.0, 9.0, 1.0
SHAPE_HEIGHT = 50.0
MAP_LEFT, MAP_RIGHT, MAP_TOP = 14.0, 12.5, 14.0
LOWEST_MAP, HIGHEST_MAP, NARROWEST_MAP = 18.0, 70.0, 20.0
"""Distances [mm] round the panels, and their heights and least width."""
BELOW_PEAK = 3e-3
"""Where the axis of line shapes ends, over the lowest of their peaks: noise lies below."""
LEAST_SPAN = 1e-3
"""Least span of a scale of colours [km s-1], and over its largest value."""
FEW_TICKS = 5
MIDDLE_OF_ALL = (2.0, 98.0)
"""Percentiles of what says something between which the colours lie: single pixels must not decide."""
MINUS = "\N{MINUS SIGN}"
MOST_WRITTEN, MOST_PLACES = 1e4, 4
"""Largest value written out, and most places behind the point."""

BAND_WORDS = "Bands: one standard error, from the replicates."
VELOCITY_WORDS = (
    "Velocities are relative to the body, positive away from the viewer; widths are standard deviations. Numbers: mean "
    "velocity and width of each line."
)
MAP_WORDS = "Hatched: a standard error above half of the width or unknown, or nothing counted."


class Map(NamedTuple):
    """A map of velocities: title, values [km s-1] (rows, columns), colours, label of the colour bar."""

    title: str
    value: NDArray[np.float64]
    colours: str
    label: str


def velocity(
    product: xr.Dataset,
    name: str | None = None,
    line: str | None = None,
    release: str | None = None,
    width: Width = "full",
) -> Figure:
    """Return line shapes in parts of an image, and maps of the mean velocity and the width in its pixels.

    The parts are the disc of the body and pieces of the tail, see `tracer.plots.apertures`.

    Parameters
    ----------
    product : xarray.Dataset
        As `open_product` gives it; without replicates there are no errors.
    name : str, optional
        The image, by its name in the product or in the run file; may be absent where only one is resolved by velocity.
    line : str, optional
        Emission line: its brightness is drawn [kR per km s-1]; column density [cm-2 per km s-1] if absent.
    release : str, optional
        Name of the release to draw; all of them together if absent.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal.

    Raises
    ------
    InputError
        Where the product has no such image, line or release, or the image is not resolved by velocity.
    """
    radius, sky, names = body_radius(product), resolved_sky(product, name), releases(product, release)
    source, stem = (product, "column") if line is None else (shining(product, line), "brightness")
    variables = ratio_names(sky.name, line is not None)
    ends = edges(product, velocity_dimension(sky.name)) * KILOMETRES_PER_SECOND
    per_bin = (PER_SQUARE_CENTIMETRE if line is None else KILORAYLEIGH) / (ends[1] - ends[0])
    parts = apertures(product, sky, radius)
    shapes = profiles(source, f"{stem}_by_velocity_{sky.name}", names, parts, per_bin)
    looks = _looks(parts, velocities_in(source, variables, names, parts))
    pixels = velocities_by_pixel(source, variables, names)
    maps = _maps(pixels)
    errors = has_replicates(source, variables.mean)
    what = "column density" if line is None else f"brightness in {line}"
    unit = "cm$^{-2}$" if line is None else "kR"
    words = [VELOCITY_WORDS, BAND_WORDS if errors else NO_REPLICATES, MAP_WORDS if errors else ""]
    vertical, horizontal = image_dimensions(sky.name)
    columns, rows = (edges(product, axis) / radius for axis in (horizontal, vertical))
    host = host_in_sky(product, radius, sky.up, sky.right, (columns[0], columns[-1]), (rows[0], rows[-1]))
    words.append(host.words(OUTLINED_WORDS) if host else "")
    with styled():
        figure, panel, places, legend = _lay_out(
            width,
            float(np.ptp(rows) / np.ptp(columns)),
            looks,
            str(product.attrs.get("title", "")),
            f"{sky.title}: {what} by velocity, {released_words(names)}",
            " ".join(filter(None, words)),
        )
        label = f"{what[0].upper()}{what[1:].split(' in ')[0]} ({unit} per km s$^{{-1}}$)"
        _draw_shapes(axes_in(figure, panel), ends, shapes, looks, label)
        draw_legend(figure, looks, width, legend)
        hatched = ~pixels.significant if errors else ~pixels.hit
        for one, place in zip(maps, places, strict=True):
            axes = axes_in(figure, place)
            _draw_map(axes, columns, rows, one.value, one.colours, hatched)
            axes.set_title(one.title, loc="left", pad=3.0)
            draw_disc(axes, sky.toward_viewer, sky.up, sky.right)
            outline_host(axes, host, sky.toward_viewer, sky.up, sky.right)
            mark_sun(axes, sky.toward_viewer, sky.up, sky.right)
            axes.set_xlabel(f"{direction_words(sky.right, 'rightward in the sky')} (body radii)")
            if width == "column" or one is maps[0]:
                axes.set_ylabel(f"{direction_words(sky.up, 'northward in the sky')}\n(body radii)")
            kilometres_across(axes, radius)
            if width == "column" or one is maps[-1]:
                kilometres_up(axes, radius)
            _draw_bar(axes_in(figure, bar_below(place)), one, pixels)
    return figure


def resolved_sky(product: xr.Dataset, wanted: str | None) -> Sky:
    """Return the image asked for, which must be resolved by velocity; the only such image where none is named.

    Raises
    ------
    InputError
        Where there is none, several and none is named, or the one named is not.
    """
    known = resolved_images(product.dims)
    if not known:
        raise InputError(
            "no image is resolved by velocity; give one velocity = { from, to, bins } in the run file"
        )
    if wanted is None and len(known) > 1:
        raise InputError(f"{len(known)} images are resolved by velocity, name one of them: {listed(known)}")
    sky = sky_of(product, known[0] if wanted is None else wanted)
    if sky.name not in known:
        raise InputError(f'image "{sky.name}" is not resolved by velocity; allowed: {listed(known)}')
    return sky


def _looks(parts: Sequence[Aperture], found: Velocities) -> list[Curve]:
    """Return the looks of the line shapes; their names tell mean and width."""
    looks = []
    for number, part in enumerate(parts):
        mean = _with_error(found.mean[number], found.mean_error[number], "+")
        width = _with_error(found.width[number], found.width_error[number], "")
        words = f"{mean}, width {width} km/s" if found.hit[number] else "nothing"
        looks.append(release_curve(number, f"{part.words}: {words}"))
    return looks


def _with_error(value: float, error: float, sign: str) -> str:
    """Return a value with its error, both to the error's first digit."""
    if not (0.0 < error < MOST_WRITTEN and abs(value) < MOST_WRITTEN):
        return f"{value:{sign}.3g}".replace("-", MINUS)
    places = min(max(0, -math.floor(math.log10(error))), MOST_PLACES)
    return f"{value:{sign}.{places}f} \N{PLUS-MINUS SIGN} {error:.{places}f}".replace("-", MINUS)


def _maps(pixels: Velocities) -> list[Map]:
    return [
        Map(
            "(b) mean velocity",
            pixels.mean,
            SHIFT_COLOURS,
            "Mean velocity away from the viewer (km s$^{-1}$)",
        ),
        Map("(c) width", pixels.width, WIDTH_COLOURS, "Width, standard deviation (km s$^{-1}$)"),
    ]


def _lay_out(
    width: Width, shape: float, looks: Sequence[Curve], title: str, subtitle: str, caption: str
) -> tuple[Figure, Box, list[Box], float]:
    """Return the figure, the panels of the line shapes and of both maps, and the legend's upper edge [mm]."""
    beside = width == "full"
    room = (0.5 if beside else 1.0) * WIDTHS[width] - MAP_LEFT - (0.5 if beside else 1.0) * MAP_RIGHT
    height = min(max(room * shape, LOWEST_MAP), HIGHEST_MAP)
    across = min(max(height / shape, NARROWEST_MAP), room)
    one_map = MAP_TOP + height + ROOM_BELOW
    legend = legend_height(looks, width) + LEGEND_GAP
    below = one_map * (1 if beside else 2)
    figure, box = framed_figure(width, TOP + SHAPE_HEIGHT + BOTTOM + legend + below, title, subtitle, caption)
    low = box.bottom + below + legend + BOTTOM
    panel = Box(LEFT, low, WIDTHS[width] - LEFT - RIGHT, SHAPE_HEIGHT)
    left, aside = MAP_LEFT + 0.5 * (room - across), 0.5 * (WIDTHS[width] - MAP_RIGHT)
    if beside:
        places = [Box(left + one * aside, box.bottom + ROOM_BELOW, across, height) for one in (0, 1)]
    else:
        places = [Box(left, box.bottom + one * one_map + ROOM_BELOW, across, height) for one in (1, 0)]
    return figure, panel, places, low - BOTTOM


def _draw_shapes(
    axes: Axes, ends: NDArray[np.float64], shapes: Sequence[Field], looks: Sequence[Curve], label: str
) -> None:
    span = log_range(shapes)
    if span is not None:
        peaks = [float(one.value[one.hit].max()) for one in shapes if one.hit.any()]
        span = (max(span[0], BELOW_PEAK * min(peaks)), span[1])
    axes.set(
        yscale="log",
        xlim=_shown(ends, shapes, span),
        ylim=span or (1.0, 10.0),
        xlabel="Velocity away from the viewer (km s$^{-1}$)",
        ylabel=label,
    )
    axes.set_title("(a) line shapes", loc="left", pad=3.0)
    set_log_ticks(axes.yaxis, *axes.get_ylim())
    axes.grid(color="0.92", linewidth=0.4)
    axes.set_axisbelow(True)
    axes.axvline(0.0, color="0.6", linewidth=0.6, zorder=1.5)
    middles = 0.5 * (ends[1:] + ends[:-1])
    for shape, look in zip(shapes, looks, strict=True):
        draw_band(axes, middles, shape, look)
    if span is None:
        say_nothing(axes, 0.5)


def _shown(
    ends: NDArray[np.float64], shapes: Sequence[Field], span: tuple[float, float] | None
) -> tuple[float, float]:
    """Return from where to where [km s-1] there is something to see, with a bin to spare."""
    seen = np.zeros(len(ends) - 1, dtype=bool)
    if span is not None:
        seen = np.any([one.hit & (one.value >= span[0]) for one in shapes], axis=0)
    bins = np.flatnonzero(seen) if seen.any() else np.array([0, len(ends) - 2])
    return float(ends[max(bins[0] - 1, 0)]), float(ends[min(bins[-1] + 2, len(ends) - 1)])


def _draw_map(
    axes: Axes,
    columns: NDArray[np.float64],
    rows: NDArray[np.float64],
    value: NDArray[np.float64],
    colours: str,
    hatched: NDArray[np.bool_],
) -> None:
    axes.set(xlim=(columns[0], columns[-1]), ylim=(rows[0], rows[-1]), aspect="equal")
    if np.isfinite(value).any():
        shown = np.ma.masked_invalid(value)
        axes.pcolormesh(columns, rows, shown, norm=_norm(value, hatched), cmap=colours, rasterized=True)
    else:
        say_nothing(axes)
    hatch_rectangles(axes, columns, rows, hatched)


def _norm(value: NDArray[np.float64], hatched: NDArray[np.bool_]) -> Normalize:
    """Return even colours over all values that say something; over all where none does."""
    known = np.isfinite(value)
    chosen = value[known & ~hatched] if (known & ~hatched).any() else value[known]
    low, high = (float(one) for one in np.percentile(chosen, MIDDLE_OF_ALL))
    least = LEAST_SPAN * max(1.0, abs(low), abs(high))
    if high - low < least:
        low, high = 0.5 * (low + high) - 0.5 * least, 0.5 * (low + high) + 0.5 * least
    return Normalize(low, high)


def _draw_bar(axes: Axes, one: Map, pixels: Velocities) -> None:
    known = np.isfinite(one.value)
    if not known.any():
        axes.remove()
        return
    norm = _norm(one.value, ~pixels.significant)
    assert norm.vmin is not None
    assert norm.vmax is not None
    bar = axes.figure.colorbar(
        ScalarMappable(norm, one.colours),
        cax=axes,
        orientation="horizontal",
        extend=POINTS[bool((one.value[known] < norm.vmin).any()), bool((one.value[known] > norm.vmax).any())],
        extendfrac=0.03,
    )
    bar.ax.xaxis.set_major_locator(MaxNLocator(FEW_TICKS, steps=STEPS))
    bar.set_label(one.label)
    bar.outline.set_linewidth(0.5)
