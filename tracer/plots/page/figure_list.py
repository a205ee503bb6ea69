"""Which figures a page shows, and what they say to those who cannot see them."""

from collections.abc import Callable, Iterator
from functools import partial
from typing import NamedTuple

import numpy as np
import xarray as xr
from matplotlib.figure import Figure

from tracer.errors import InputError
from tracer.plots.apertures import apertures
from tracer.plots.budget import budget_of, look
from tracer.plots.field import Field, releases, variable
from tracer.plots.figures import FIGURES, Choice, What
from tracer.plots.ground_map import COLUMN, MAPS, GroundMap
from tracer.plots.moving import event_note, motion_of
from tracer.plots.page.reading import number, percent, raised
from tracer.plots.plan_table import FORBIDDEN, PlanTable
from tracer.plots.reading_units import KILORAYLEIGH, PER_CUBIC_CENTIMETRE, PER_SQUARE_CENTIMETRE
from tracer.plots.sky import image_names, line_names, shining, sky_of
from tracer.plots.style import Width
from tracer.plots.tail import strip_of
from tracer.plots.timeline import timeline
from tracer.plots.velocity_sums import velocities_in
from tracer.product.layout import ratio_names, resolved_images

NOTHING = "Nothing was counted."


class PageFigure(NamedTuple):
    """A figure of a page: name for links, heading, text instead of it, and how it is drawn at a width."""

    name: str
    heading: str
    alternative: str
    draw: Callable[[Width], Figure]


def product_figures(product: xr.Dataset) -> Iterator[PageFigure]:
    """Yield the figures of a product, in the order of reading."""
    yield _figure(product, What.LEDGER, "Particle budget", _budget_words(product))
    yield _figure(product, What.DENSITY, "Number density in two planes", _density_words(product))
    yield _figure(product, What.PROFILE, "Number density against altitude", _profile_words(product))
    for name in image_names(product):
        yield from _image_figures(product, name)
    yield _figure(product, What.COLUMN, "Column density above the ground", _map_words(product, COLUMN))
    for word, what in MAPS.items():
        if word != What.COLUMN and what.variable in product:
            yield _figure(product, What(word), what.words, _map_words(product, what))


def plan_figure(plan: PlanTable) -> PageFigure:
    """Return the figure of a plan."""
    ratio = plan.numbers("snr")
    best = (
        f" The best signal-to-noise ratio is {number(float(np.nanmax(ratio)), 3)}."
        if np.isfinite(ratio).any()
        else ""
    )
    words = (
        f"Brightness, signal-to-noise ratio, geometry and flags of {plan.rows} exposures in time.{best} "
        f"{int(plan.flags(FORBIDDEN).sum())} are marked as not to be commanded."
    )
    return PageFigure("figure-plan", "Planned observation in time", words, partial(timeline, plan))


def _figure(
    product: xr.Dataset,
    what: What,
    heading: str,
    words: str,
    image: str | None = None,
    line: str | None = None,
) -> PageFigure:
    def draw(width: Width) -> Figure:
        return FIGURES[what].draw(product, Choice(None, image, line, width))

    name = "-".join(filter(None, ["figure", what, image, line]))
    return PageFigure(name, heading, words, draw)


def _image_figures(product: xr.Dataset, name: str) -> Iterator[PageFigure]:
    sky = sky_of(product, name)
    names = releases(product, None)
    field = variable(product, f"column_{name}", names, PER_SQUARE_CENTIMETRE)
    words = f"Image of column density.{_largest(field, 'cm-2')}"
    yield _figure(product, What.IMAGE, f"Column density: {sky.title}", words, name)
    strongest_line = None
    if lines := line_names(product):
        fields = [
            variable(shining(product, line), f"brightness_{name}", names, KILORAYLEIGH) for line in lines
        ]
        strongest = int(np.argmax([one.value.max(initial=0.0) for one in fields]))
        strongest_line = lines[strongest]
        words = f"Image of brightness in {lines[strongest]}.{_largest(fields[strongest], 'kR')}"
        heading = f"Brightness in {lines[strongest]}: {sky.title}"
        yield _figure(product, What.IMAGE, heading, words, name, lines[strongest])
    if name in resolved_images(product.dims):
        yield _velocity_figure(product, name, strongest_line)
    try:
        strip_of(product, sky, float(product.attrs["body_radius"]))
    except InputError:
        return
    words = (
        f"Column density along the axis from the Sun through the body, by release.{_largest(field, 'cm-2')}"
    )
    yield _figure(product, What.TAIL, f"Along the tail axis: {sky.title}", words, name)


def _velocity_figure(product: xr.Dataset, name: str, line: str | None) -> PageFigure:
    sky = sky_of(product, name)
    source = product if line is None else shining(product, line)
    parts = apertures(product, sky, float(product.attrs["body_radius"]))
    found = velocities_in(source, ratio_names(name, line is not None), releases(product, None), parts)
    said = [
        f"{part.words}: mean {number(found.mean[i], 3)} km/s, width {number(found.width[i], 3)} km/s"
        for i, part in enumerate(parts)
        if found.hit[i]
    ]
    words = (
        "Line shapes along the line of sight, positive away from the viewer, and maps of mean velocity and width. "
        + (f"In parts of the image: {'; '.join(said)}." if said else NOTHING)
    )
    what = "column density" if line is None else line
    return _figure(product, What.VELOCITY, f"Velocities, {what}: {sky.title}", words, name, line)


def _budget_words(product: xr.Dataset) -> str:
    budget = budget_of(product, releases(product, None))
    total = float(budget.rate[-1].sum()) if budget.fates else 0.0
    if not total > 0.0:
        return NOTHING
    shares = [
        f"{percent(float(rate) / total)} {look(fate).words}"
        for fate, rate in zip(budget.fates, budget.rate[-1], strict=True)
    ]
    released = "released atoms" if motion_of(product) is None else "atoms released at the stated position"
    return f"Of all {released}: {', '.join(shares)}."


def _density_words(product: xr.Dataset) -> str:
    field = variable(product, "number_density", releases(product, None), PER_CUBIC_CENTIMETRE)
    return f"Number density round the body in the equatorial and the noon-midnight plane.{_largest(field, 'cm-3')}"


def _profile_words(product: xr.Dataset) -> str:
    field = variable(product, "number_density", releases(product, None), PER_CUBIC_CENTIMETRE)
    hours = product["local_time"].values
    by_day = (hours > 6.0) & (hours < 18.0)
    words = []
    for side, chosen in (("day", by_day), ("night", ~by_day)):
        lowest = field.value[0][:, chosen]
        if lowest.size:
            words.append(f"{number(float(lowest.mean()), 3)} {raised('cm-3')} by {side}")
    return f"Density against altitude, by release. In the lowest layer: {' and '.join(words)}, averaged over cells."


def _map_words(product: xr.Dataset, what: GroundMap) -> str:
    field = variable(product, what.variable, releases(product, None), what.factor)
    if not field.hit.any():
        return f"{what.words}. {NOTHING}"
    row, column = np.unravel_index(int(np.argmax(field.value)), field.value.shape)
    largest = f"{number(float(field.value[row, column]), 3)} {raised(what.unit)}"
    latitude, hour = product["latitude"].values[row], product["local_time"].values[column]
    place = f"latitude {latitude:.3g} deg and local time {hour:.3g} h"
    told = f"{what.words}, over latitude and local time. Largest, {largest}, at {place}."
    return " ".join(filter(None, [told, event_note(product, what.variable)]))


def _largest(field: Field, unit: str) -> str:
    if not field.hit.any():
        return f" {NOTHING}"
    return f" The largest value is {number(float(field.value.max()), 3)} {raised(unit)}."
