"""Figure: number density in the equatorial plane and in the plane of noon and midnight."""

from typing import NamedTuple

import xarray as xr
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Circle
from matplotlib.patheffects import withStroke
from matplotlib.ticker import MaxNLocator

from tracer.plots.body import Vector, draw_body, mark_sun
from tracer.plots.colour_scale import Span, bar_below, colour_span, draw_colour_bar, room_below
from tracer.plots.field import released_words, releases
from tracer.plots.host import CUT_WORDS, HostDisc, host_in_plane, name_host
from tracer.plots.lengths import MOST_STEPS, STEPS, body_radius, kilometres_across, kilometres_up
from tracer.plots.planes import PlaneCells, draw_cells, equatorial, noon_midnight
from tracer.plots.reading_units import PER_CUBIC_CENTIMETRE
from tracer.plots.significance import note, say_nothing
from tracer.plots.style import NUMBER_DENSITY_COLOURS, SMALL_SIZE, WIDTHS, Box, Width, axes_in, styled
from tracer.plots.words import framed_figure

ROOM = 1.16
"""Half width of a panel over the radius of the grid's top, with room for the local times."""
LEFT, RIGHT, TOP = 11.0, 12.5, 9.5
BETWEEN_BESIDE, BETWEEN_STACKED = 12.0, 6.0
"""Distances [mm] round and between the panels."""


class View(NamedTuple):
    """A plane as it is looked at: directions in the Sun-fixed frame, and words."""

    title: str
    toward_viewer: Vector
    up: Vector
    right: Vector
    marks: tuple[str, str, str, str]
    """What lies at the right, above, at the left and below."""
    ylabel: str


EQUATORIAL = View(
    "(a) equatorial plane, from north",
    (0.0, 0.0, 1.0),
    (0.0, 1.0, 0.0),
    (1.0, 0.0, 0.0),
    ("12 h", "18 h", "0 h", "6 h"),
    "$y$, toward dusk (body radii)",
)
NOON_MIDNIGHT = View(
    "(b) noon-midnight plane, from dawn",
    (0.0, -1.0, 0.0),
    (0.0, 0.0, 1.0),
    (1.0, 0.0, 0.0),
    ("12 h", "north", "0 h", "south"),
    "$z$, northward (body radii)",
)


def density(product: xr.Dataset, release: str | None = None, width: Width = "full") -> Figure:
    """Return number density [cm-3] in the equatorial and the noon-midnight plane, in logarithmic colours.

    Both planes have the Sun at the right; dusk is up in the first, north in the second. A plane between two
    rows of cells shows their mean.

    Parameters
    ----------
    product : xarray.Dataset
        As `open_product` gives it.
    release : str, optional
        Name of the release to draw; the sum over all if absent.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal; the planes stand above or beside
        each other.

    Raises
    ------
    InputError
        Where the product has no such release.
    """
    names, radius = releases(product, release), body_radius(product)
    planes = [
        make(product, names, radius, "number_density", PER_CUBIC_CENTIMETRE)
        for make in (equatorial, noon_midnight)
    ]
    fields = [plane.field for plane in planes]
    span = colour_span(fields)
    top = float(planes[0].radii[-1])
    hosts = [
        host_in_plane(product, radius, view.toward_viewer, view.up, view.right, top)
        for view in (EQUATORIAL, NOON_MIDNIGHT)
    ]
    cut = [host.words(CUT_WORDS) for host in hosts if host]
    with styled():
        figure, panels, bar = _lay_out(
            width,
            room_below(span),
            str(product.attrs.get("title", "")),
            f"Number density, {released_words(names)}",
            " ".join([*filter(None, [note(fields, names)]), *cut[:1]]),
        )
        for axes, plane, view, host in zip(panels, planes, (EQUATORIAL, NOON_MIDNIGHT), hosts, strict=True):
            _draw_panel(axes, plane, view, span, host)
        _label(panels, width, radius)
        draw_colour_bar(
            axes_in(figure, bar), span, NUMBER_DENSITY_COLOURS, "Number density (cm$^{-3}$)", fields
        )
    return figure


def _lay_out(
    width: Width, below: float, title: str, subtitle: str, caption: str
) -> tuple[Figure, list[Axes], Box]:
    """Return the figure, its two panels and the colour bar's box: panels side by side, or stacked in a column."""
    beside = width == "full"
    side = (WIDTHS[width] - LEFT - RIGHT - (BETWEEN_BESIDE if beside else 0.0)) / (2.0 if beside else 1.0)
    stack = side if beside else 2.0 * side + BETWEEN_STACKED
    figure, box = framed_figure(width, TOP + stack + below, title, subtitle, caption)
    low = box.bottom + below
    if beside:
        places = [Box(LEFT, low, side, side), Box(LEFT + side + BETWEEN_BESIDE, low, side, side)]
    else:
        places = [Box(LEFT, low + side + BETWEEN_STACKED, side, side), Box(LEFT, low, side, side)]
    bar = bar_below(Box(LEFT, low, places[1].left + side - LEFT, stack))
    return figure, [axes_in(figure, place) for place in places], bar


def _draw_panel(axes: Axes, plane: PlaneCells, view: View, span: Span | None, host: HostDisc | None) -> None:
    top = float(plane.radii[-1])
    axes.set(xlim=(-ROOM * top, ROOM * top), ylim=(-ROOM * top, ROOM * top), aspect="equal")
    for axis in (axes.xaxis, axes.yaxis):
        axis.set_major_locator(MaxNLocator(MOST_STEPS, steps=STEPS))
    draw_cells(axes, plane, span, NUMBER_DENSITY_COLOURS)
    axes.add_patch(Circle((0.0, 0.0), top, fill=False, edgecolor="0.4", linewidth=0.4))
    draw_body(axes, view.toward_viewer, view.up, view.right)
    if host:
        draw_body(axes, view.toward_viewer, view.up, view.right, host.disc)
        name_host(axes, host)
    mark_sun(axes, view.toward_viewer, view.up, view.right)
    if span is None:
        say_nothing(axes)
    middle = 0.5 * (1.0 + ROOM) * top
    for (x, y), words in zip(((1, 0), (0, 1), (-1, 0), (0, -1)), view.marks, strict=True):
        axes.text(
            x * middle,
            y * middle,
            words,
            ha="center",
            va="center",
            fontsize=SMALL_SIZE,
            rotation=90.0 * (x != 0),
            path_effects=[withStroke(linewidth=1.5, foreground="white")],
            zorder=4.0,
        )


def _label(panels: list[Axes], width: Width, radius: float) -> None:
    for axes, view in zip(panels, (EQUATORIAL, NOON_MIDNIGHT), strict=True):
        axes.set(xlabel="$x$, toward the Sun (body radii)", ylabel=view.ylabel)
        first_of_stack = width == "column" and axes is panels[0]
        if first_of_stack:
            axes.set_xlabel("")
            axes.tick_params(labelbottom=False)
        if width == "full" or first_of_stack:
            kilometres_across(axes, radius)
        if width == "column" or axes is panels[1]:
            kilometres_up(axes, radius)
        # Beside the kilometres' unit where there is one; `y` keeps matplotlib from moving the title once more.
        above = width == "full" or first_of_stack
        axes.set_title(view.title, loc="left", y=1.0, pad=13.0 if above else 3.0)
