"""The field of bodies over gases: escape speed against temperature, with the limits of retention."""

from collections.abc import Sequence
from itertools import cycle
from typing import NamedTuple

import numpy as np
import numpy.typing as npt
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patheffects import withStroke
from matplotlib.text import Annotation
from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter
from matplotlib.transforms import Bbox, BboxBase

Floats = npt.NDArray[np.float64]

DOTS_PER_INCH = 150

COLOURS = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9")
"""Told apart by colour-blind eyes too (Okabe & Ito 2008, Color Universal Design; memory)."""

NAME_PLACES = (
    (7.0, 0.0, "left"),
    (-7.0, 0.0, "right"),
    (0.0, 9.0, "center"),
    (0.0, -9.0, "center"),
    (7.0, 8.0, "left"),
    (7.0, -8.0, "left"),
    (-7.0, 8.0, "right"),
    (-7.0, -8.0, "right"),
)
"""Where a body's name may stand: offsets [points] from its point and alignment, the better first."""

ROW = 11.0
"""Least distance [points] between the names of two gases."""

DEPTH = 10.0
"""Bodies for comparison this factor below the lowest limit are left out: Phobos would stretch the axis."""

MOST_BANDS = 6
"""More bands than this are drawn without their tint, which would hide one another."""

LETTERS = 0.7
"""Height of letters over that of a name's box."""

HALO = (withStroke(linewidth=2.5, foreground="white"),)

SIX_TIMES_DASHES = (0.0, (4.0, 2.0))


class BodyPoint(NamedTuple):
    """A body: `temperature` [K], `escape_speed` [m s-1]; `asked_for` False where it only stands for comparison."""

    name: str
    temperature: float
    escape_speed: float
    asked_for: bool


class GasLimit(NamedTuple):
    """The limits of a gas at 1 K; both grow as the square root of temperature.

    Escape speeds [m s-1] at which its e-folding time of escape is the age of the Solar System (`kept`), and at which
    they are six rms speeds (`six_times`).
    """

    name: str
    kept: float
    six_times: float


def retention_field(bodies: Sequence[BodyPoint], gases: Sequence[GasLimit], kept_words: str) -> Figure:
    """Return the figure: one point a body, one band a gas.

    A body above a gas's band keeps it; one below loses it within the age of the Solar System; within the band only the
    six-times rule says that the gas leaks.

    Parameters
    ----------
    bodies : sequence of BodyPoint
        At least one of them asked for. Of the others, those with very low escape speeds are left out.
    gases : sequence of GasLimit
        At least one, in any order.
    kept_words : str
        What the lower limit is, for the legend.
    """
    figure = Figure(figsize=(7.1, 5.9), dpi=DOTS_PER_INCH, layout="constrained")
    FigureCanvasAgg(figure)
    axes = figure.add_subplot()
    kelvin = _temperature_range(bodies)
    speeds = _speed_range(bodies, gases, kelvin)
    shown = [body for body in bodies if speeds[0] < body.escape_speed < speeds[1]]
    axes.set(xscale="log", yscale="log", xlim=kelvin, ylim=speeds)
    _dress(axes)
    _draw_limits(axes, gases, kelvin)
    _draw_bodies(axes, shown)
    others = any(not body.asked_for for body in shown)
    figure.legend(
        handles=_keys(kept_words, others), loc="outside lower left", ncols=2, frameon=False, fontsize=8
    )
    # Names are placed by where things lie on the page, which is known once the layout is.
    figure.draw_without_rendering()
    _name_gases(axes, gases, kelvin[1])
    figure.draw_without_rendering()
    _name_bodies(axes, shown)
    return figure


def _temperature_range(bodies: Sequence[BodyPoint]) -> tuple[float, float]:
    kelvin = [body.temperature for body in bodies]
    return 0.75 * min(kelvin), 1.5 * max(kelvin)


def _speed_range(
    bodies: Sequence[BodyPoint], gases: Sequence[GasLimit], kelvin: tuple[float, float]
) -> tuple[float, float]:
    lowest = min(gas.kept for gas in gases) * kelvin[0] ** 0.5
    highest = max(gas.six_times for gas in gases) * kelvin[1] ** 0.5
    shown = [body.escape_speed for body in bodies if body.asked_for or body.escape_speed > lowest / DEPTH]
    return 0.7 * min(*shown, lowest), 1.4 * max(*shown, highest)


def _dress(axes: Axes) -> None:
    axes.set_title("Thermal escape: a body above a gas's band keeps it, one below loses it", fontsize=10)
    axes.set_xlabel("surface temperature [K]")
    axes.set_ylabel("escape speed [km/s]")
    for axis, size, steps in ((axes.xaxis, 1.0, (1.0, 2.0, 3.0, 5.0)), (axes.yaxis, 1e3, (1.0, 2.0, 5.0))):
        axis.set_major_locator(LogLocator(subs=steps, numticks=40))
        axis.set_major_formatter(FuncFormatter(lambda value, _, size=size: f"{value / size:g}"))
        axis.set_minor_formatter(NullFormatter())
    axes.grid(visible=True, color="0.92", linewidth=0.6)
    axes.set_axisbelow(True)


def _draw_limits(axes: Axes, gases: Sequence[GasLimit], kelvin: tuple[float, float]) -> None:
    # Straight lines on logarithmic axes: two ends are enough.
    ends = np.array(kelvin)
    for gas, colour in _coloured(gases):
        kept, six_times = gas.kept * np.sqrt(ends), gas.six_times * np.sqrt(ends)
        if len(gases) <= MOST_BANDS:
            axes.fill_between(ends, kept, six_times, color=colour, alpha=0.2, linewidth=0.0)
        axes.plot(ends, kept, color=colour, linewidth=1.3)
        axes.plot(ends, six_times, color=colour, linewidth=1.0, linestyle=SIX_TIMES_DASHES)


def _draw_bodies(axes: Axes, bodies: Sequence[BodyPoint]) -> None:
    for body in bodies:
        face = "black" if body.asked_for else "white"
        axes.plot(
            body.temperature, body.escape_speed, "o", color="black", markerfacecolor=face, markersize=5.5
        )


def _keys(kept_words: str, others: bool) -> list[Line2D]:
    keys = [
        Line2D([], [], color="0.3", linewidth=1.3, label=kept_words),
        Line2D(
            [],
            [],
            color="0.3",
            linewidth=1.0,
            linestyle=SIX_TIMES_DASHES,
            label="escape speed = 6 rms speeds: the six-times rule",
        ),
        Line2D([], [], color="black", marker="o", linestyle="none", label="body asked for"),
    ]
    if others:
        keys.append(
            Line2D(
                [],
                [],
                color="black",
                marker="o",
                markerfacecolor="white",
                linestyle="none",
                label="other bodies of the catalogue, subsolar equilibrium",
            )
        )
    return keys


def _name_gases(axes: Axes, gases: Sequence[GasLimit], kelvin: float) -> None:
    """Write the gases' names at the right end of their bands, spread so that none covers another."""
    coloured = _coloured(gases)
    middles = [float(np.sqrt(gas.kept * gas.six_times * kelvin)) for gas, _ in coloured]
    heights = axes.transData.transform([(kelvin, middle) for middle in middles])[:, 1] * 72.0 / DOTS_PER_INCH
    for (gas, colour), middle, shift in zip(coloured, middles, spread(heights, ROW) - heights, strict=True):
        axes.annotate(
            gas.name,
            (kelvin, middle),
            xytext=(14.0, shift),
            textcoords="offset points",
            color=colour,
            va="center",
            fontsize=9,
            fontweight="bold",
            annotation_clip=False,
            arrowprops={
                "arrowstyle": "-",
                "color": colour,
                "linewidth": 0.6,
                "relpos": (0.0, 0.5),
                "shrinkA": 1.0,
                "shrinkB": 0.0,
            },
        )


def spread(places: Floats, gap: float) -> Floats:
    """Return rising `places` moved as little as need be to lie `gap` apart (least squares, pooled neighbours)."""
    levels = places - gap * np.arange(places.size)
    # Pool adjacent violators: groups that would have to cross stand around their common mean.
    groups: list[tuple[float, int]] = []
    for level in levels:
        mean, count = float(level), 1
        while groups and groups[-1][0] >= mean:
            before, members = groups.pop()
            mean = (mean * count + before * members) / (count + members)
            count += members
        groups.append((mean, count))
    means = np.repeat([mean for mean, _ in groups], [count for _, count in groups])
    return np.asarray(means + gap * np.arange(places.size), dtype=np.float64)


def _name_bodies(axes: Axes, bodies: Sequence[BodyPoint]) -> None:
    """Write each body's name where it covers no point and no other name, as far as there is room."""
    points = axes.transData.transform([(body.temperature, body.escape_speed) for body in bodies])
    taken = [Bbox.from_extents(x - 7.0, y - 7.0, x + 7.0, y + 7.0) for x, y in points]
    # Those asked for choose first.
    for body in sorted(bodies, key=lambda body: not body.asked_for):
        name = axes.annotate(
            body.name,
            (body.temperature, body.escape_speed),
            textcoords="offset points",
            xytext=(0.0, 0.0),
            va="center",
            fontsize=8.5,
            color="black" if body.asked_for else "0.35",
            path_effects=HALO,
        )
        best, least = NAME_PLACES[0], np.inf
        for place in NAME_PLACES:
            box = _stand(name, place)
            covered = sum(_common_area(box, other) for other in taken) + _area_beyond(box, axes.bbox)
            if covered < least:
                best, least = place, covered
        taken.append(_stand(name, best))


def _stand(name: Annotation, place: tuple[float, float, str]) -> Bbox:
    """Put a name in its place and return the box of its letters [pixels], without the room above and below them."""
    x, y, side = place
    name.set(position=(x, y), horizontalalignment=side)
    return Bbox(name.get_window_extent()).shrunk(1.0, LETTERS)


def _common_area(one: Bbox, other: Bbox) -> float:
    common = Bbox.intersection(one, other)
    return 0.0 if common is None else float(common.width * common.height)


def _area_beyond(box: Bbox, frame: BboxBase) -> float:
    return float(box.width * box.height) - _common_area(box, Bbox(frame.get_points()))


def _coloured(gases: Sequence[GasLimit]) -> list[tuple[GasLimit, str]]:
    """Return the gases from the heaviest up, each with its colour."""
    return list(zip(sorted(gases, key=lambda gas: gas.six_times), cycle(COLOURS), strict=False))
