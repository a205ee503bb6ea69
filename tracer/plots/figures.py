"""All figures of a product by the word that asks for them."""

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
from tracer.plots.tail import tail
from tracer.plots.velocity import velocity


class What(StrEnum):
    """The figures of a product, and that of a plan."""

    COLUMN = "column"
    DENSITY = "density"
    IMAGE = "image"
    LEDGER = "ledger"
    PROFILE = "profile"
    TAIL = "tail"
    VELOCITY = "velocity"
    RELEASE_MAP = "release-map"
    RETURN_MAP = "return-map"
    CAPTURE_MAP = "capture-map"
    ESCAPE_MAP = "escape-map"
    ESCAPE_DIRECTIONS = "escape-directions"
    PLAN = "plan"


class Choice(NamedTuple):
    """What to draw of a product; None stands for all releases, the only image, column density."""

    release: str | None = None
    image: str | None = None
    line: str | None = None
    width: Width = "full"


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
    What.RELEASE_MAP: Drawing("where new atoms leave the ground", partial(_map, MAPS[What.RELEASE_MAP])),
    What.RETURN_MAP: Drawing("where atoms land", partial(_map, MAPS[What.RETURN_MAP])),
    What.CAPTURE_MAP: Drawing("where the ground keeps them", partial(_map, MAPS[What.CAPTURE_MAP])),
    What.ESCAPE_MAP: Drawing("where those that escape came from", partial(_map, MAPS[What.ESCAPE_MAP])),
    What.ESCAPE_DIRECTIONS: Drawing(
        "where they cross the outer sphere", partial(_map, MAPS[What.ESCAPE_DIRECTIONS])
    ),
}
"""Figures of a product: all but that of a plan."""
