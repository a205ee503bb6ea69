"""All figures of a product, of a run or a sweep, by the word that asks for them."""

from collections.abc import Callable
from enum import StrEnum
from functools import partial
from typing import NamedTuple

import xarray as xr
from matplotlib.figure import Figure

from tracer.plots.density import density
from tracer.plots.ground_map import MAPS, GroundMap, ground_map
from tracer.plots.image import image
from tracer.plots.ledger import ledger
from tracer.plots.profile import profile
from tracer.plots.style import Width
from tracer.plots.swept.brightness import SkyPlace, swept_brightness
from tracer.plots.swept.column import Place, swept_column
from tracer.plots.swept.ledger import swept_ledger
from tracer.plots.swept.tail import swept_tail
from tracer.plots.tail import tail
from tracer.plots.velocity import velocity


class What(StrEnum):
    """The figures of a product, that of a plan, and those of a sweep."""

    COLUMN = "column"
    DENSITY = "density"
    IMAGE = "image"
    LEDGER = "ledger"
    PROFILE = "profile"
    TAIL = "tail"
    VELOCITY = "velocity"
    ADSORBED_MAP = "adsorbed-map"
    RELEASE_MAP = "release-map"
    RETURN_MAP = "return-map"
    CAPTURE_MAP = "capture-map"
    ESCAPE_MAP = "escape-map"
    ESCAPE_DIRECTIONS = "escape-directions"
    PLAN = "plan"
    SWEPT_LEDGER = "swept-ledger"
    SWEPT_COLUMN = "swept-column"
    SWEPT_BRIGHTNESS = "swept-brightness"
    SWEPT_TAIL = "swept-tail"


class Choice(NamedTuple):
    """What to draw of a product; None stands for all releases, the only image, column density.

    The others are those of a sweep: a fate, a place on the ground, one in the sky, the level down to which a tail
    counts.
    """

    release: str | None = None
    image: str | None = None
    line: str | None = None
    width: Width = "full"
    fate: str | None = None
    place: Place | None = None
    sky: SkyPlace | None = None
    level: float | None = None


class Drawing(NamedTuple):
    """A figure: its line in the help, how it is drawn, and whether it is one of an image."""

    help: str
    draw: Callable[[xr.Dataset, Choice], Figure]
    of_image: bool = False


def _plain(
    function: Callable[[xr.Dataset, str | None, Width], Figure], product: xr.Dataset, choice: Choice
) -> Figure:
    return function(product, choice.release, choice.width)


def _map(what: GroundMap, product: xr.Dataset, choice: Choice) -> Figure:
    return ground_map(product, what, choice.release, choice.width)


def _of_image(function: Callable[..., Figure], product: xr.Dataset, choice: Choice) -> Figure:
    return function(product, choice.image, choice.line, choice.release, choice.width)


FIGURES: dict[What, Drawing] = {
    What.COLUMN: Drawing("above the ground, over latitude and local time", partial(_map, MAPS[What.COLUMN])),
    What.DENSITY: Drawing("in the equatorial and the noon-midnight plane", partial(_plain, density)),
    What.IMAGE: Drawing("as a viewer sees it, with contours of error", partial(_of_image, image), True),
    What.LEDGER: Drawing("the particle budget", partial(_plain, ledger)),
    What.PROFILE: Drawing("density against altitude by day and by night", partial(_plain, profile)),
    What.TAIL: Drawing("along the tail axis of an image", partial(_of_image, tail), True),
    What.VELOCITY: Drawing(
        "line shapes, shifts and widths in an image resolved by velocity", partial(_of_image, velocity), True
    ),
    What.ADSORBED_MAP: Drawing("where atoms rest on the ground", partial(_map, MAPS[What.ADSORBED_MAP])),
    What.RELEASE_MAP: Drawing("where new atoms leave the ground", partial(_map, MAPS[What.RELEASE_MAP])),
    What.RETURN_MAP: Drawing("where atoms land", partial(_map, MAPS[What.RETURN_MAP])),
    What.CAPTURE_MAP: Drawing("where the ground keeps them", partial(_map, MAPS[What.CAPTURE_MAP])),
    What.ESCAPE_MAP: Drawing("where those that escape came from", partial(_map, MAPS[What.ESCAPE_MAP])),
    What.ESCAPE_DIRECTIONS: Drawing(
        "where they cross the outer sphere", partial(_map, MAPS[What.ESCAPE_DIRECTIONS])
    ),
}
"""Figures of a run's product."""


def _swept_ledger(sweep: xr.Dataset, choice: Choice) -> Figure:
    return swept_ledger(sweep, choice.release, choice.fate, choice.width)


def _swept_column(sweep: xr.Dataset, choice: Choice) -> Figure:
    return swept_column(sweep, choice.release, choice.place, choice.width)


def _swept_brightness(sweep: xr.Dataset, choice: Choice) -> Figure:
    return swept_brightness(sweep, choice.image, choice.line, choice.release, choice.sky, choice.width)


def _swept_tail(sweep: xr.Dataset, choice: Choice) -> Figure:
    return swept_tail(sweep, choice.level, choice.image, choice.line, choice.release, choice.width)


SWEPT_FIGURES: dict[What, Drawing] = {
    What.SWEPT_LEDGER: Drawing("what share escapes, is ionised, ..., against what varies", _swept_ledger),
    What.SWEPT_COLUMN: Drawing("above the ground by day and night, or at --place", _swept_column),
    What.SWEPT_BRIGHTNESS: Drawing("of one line of sight of an image, at --sky", _swept_brightness, True),
    What.SWEPT_TAIL: Drawing("how far down the tail an image shows --level", _swept_tail, True),
}
"""Figures of a sweep's product."""
