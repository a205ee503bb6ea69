"""Figure: how long the tail is down to a given brightness, against what varies."""

from collections.abc import Sequence
from functools import partial

import numpy as np
import xarray as xr
from matplotlib.figure import Figure
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.plots.field import Field, released_words, releases
from tracer.plots.lengths import body_radius
from tracer.plots.seen import Seen, of_line, seen_in
from tracer.plots.sky import sky_of
from tracer.plots.style import Width
from tracer.plots.sums import NO_REPLICATES, has_replicates, replicate_sums, summed
from tracer.plots.swept.axes import points_of
from tracer.plots.swept.drawing import Words, family_lines, lines_figure, map_figure
from tracer.plots.swept.per_point import of_each_point
from tracer.plots.tail import Strip, strip_of

PER_SQUARE = "\N{SUPERSCRIPT MINUS}\N{SUPERSCRIPT TWO}"
"""In plain letters, since titles have no formulas."""
FROM = 1.0
"""Distance downtail [body radii] where a tail begins: in front of it lies the body."""

Floats = NDArray[np.float64]


def swept_tail(
    sweep: xr.Dataset,
    level: float | None,
    name: str | None = None,
    line: str | None = None,
    release: str | None = None,
    width: Width = "full",
) -> Figure:
    """Return the distance down the tail axis at which an image falls to a level, against what varies.

    Along the axis the image is averaged over one body radius to either side, as in `plots.tail`. The length is where
    that mean, from the body outwards, first falls below the level, its logarithm straight between bins. Errors come
    from leaving out one replicate after the other (the jackknife; Efron & Stein 1981, Ann. Statist. 9, 586; memory).

    Parameters
    ----------
    sweep : xarray.Dataset
        As `open_sweep` gives it.
    level : float
        Brightness [kR], or column density [cm-2] without a line. None is refused, with the range there is.
    name, line, release
        As in `plots.tail`.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal.

    Raises
    ------
    InputError
        No such image, line or release, an image without a tail axis, no level or one that no point's tail falls to, or
        more than two swept dimensions.
    """
    source = of_line(sweep, line)
    names, points, sky = releases(sweep, release), points_of(sweep), sky_of(sweep, name)
    seen, strip = seen_in(sky, line), strip_of(sweep, sky, body_radius(sweep))
    lengths = of_each_point(
        source, points, partial(_tail_length, seen=seen, names=names, strip=strip, level=level or np.inf)
    )
    unit = "cm-2" if line is None else "kR"
    if level is None or not lengths.value.any():
        raise InputError(_why_no_length(source, points.numbers, strip, seen, names, level, unit))
    end = float(strip.middles[-1])
    at_least = lengths.value >= end
    caption = f"Mean within {strip.words} of the tail axis; distances are those in the sky."
    if at_least.any():
        caption += f" Arrows: still above the level at the image's end, {end:.4g} body radii."
    if not lengths.value.all():
        caption += " Gaps: nowhere behind the body above the level."
    if not has_replicates(source, seen.variable):
        caption = f"{caption} {NO_REPLICATES}"
    words = Words(
        f"{sky.title}: length of the tail down to {level:g} {unit.replace('-2', PER_SQUARE)}, {seen.what}, "
        f"{released_words(names)}",
        "Downtail distance (body radii)",
        caption,
    )
    if points.as_map:
        return map_figure(sweep, points, lengths, words, seen.colours, width)
    return lines_figure(sweep, points, family_lines(points, lengths, at_least), words, width)


def _tail_length(product: xr.Dataset, seen: Seen, names: Sequence[str], strip: Strip, level: float) -> Field:
    along = summed(product, seen.variable, names, strip.means, seen.factor).value
    length = np.array(length_above(along, strip.middles, level))
    if not has_replicates(product, seen.variable):
        return Field(length, np.array(np.nan))
    parts, batches = replicate_sums(product, seen.variable, names, strip.means, seen.factor)
    share = batches / batches.sum()
    whole = share @ parts
    without = [
        length_above((whole - s * part) / (1.0 - s), strip.middles, level)
        for s, part in zip(share, parts, strict=True)
    ]
    spread = np.array(without) - share @ np.array(without)
    error = float(np.sqrt(np.sum((1.0 - share) * spread**2)))
    # At the image's end, or within the first bin, a length cannot scatter.
    return Field(length, np.array(error if error > 0.0 else np.nan))


def length_above(along: Floats, middles: Floats, level: float) -> float:
    """Return where `along` the tail a brightness first falls below `level`, going outwards.

    Parameters
    ----------
    along, middles : ndarray, shape (M,)
        Brightness and rising distances downtail [body radii]; those in front of one radius do not count.
    level : float
        In the unit of `along`.

    Returns
    -------
    float
        In body radii: 0 where there is no tail above the level, the last of `middles` where it never falls below.
    """
    behind = middles >= FROM
    values, places = along[behind], middles[behind]
    below = np.flatnonzero(~(values >= level))
    if not values.size or (below.size and below[0] == 0):
        return 0.0
    if not below.size:
        return float(places[-1])
    outer = int(below[0])
    high, low = float(values[outer - 1]), float(values[outer])
    if not low > 0.0:
        return float(places[outer - 1])
    share = np.log(high / level) / np.log(high / low)
    return float(places[outer - 1] + share * (places[outer] - places[outer - 1]))


def _why_no_length(
    source: xr.Dataset,
    numbers: NDArray[np.int64],
    strip: Strip,
    seen: Seen,
    names: Sequence[str],
    level: float | None,
    unit: str,
) -> str:
    def along(product: xr.Dataset) -> Field:
        return summed(product, seen.variable, names, strip.means, seen.factor)

    points = points_of(source)._replace(numbers=numbers)
    values = of_each_point(source, points, along).value[..., strip.middles >= FROM]
    found = values[values > 0.0]
    there = (
        f"the tails show {found.min():.3g} to {found.max():.3g} {unit}" if found.size else "there is no tail"
    )
    if level is None:
        return f"--level is needed, in {unit}: how bright a tail counts; {there}"
    return f"no tail reaches the level of {level:g} {unit}; {there}"
