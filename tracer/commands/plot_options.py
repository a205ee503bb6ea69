"""The options of `tracer plot`: which figure of what, and how large."""

from enum import StrEnum
from typing import Annotated

import typer

from tracer.commands.arguments import argument, option
from tracer.commands.output_file import FIGURE_ENDINGS
from tracer.plots.figures import FIGURES, SWEPT_FIGURES, What


class WidthName(StrEnum):
    """The widths of a figure."""

    COLUMN = "column"
    FULL = "full"


HELP = " ".join(
    [
        *(f"{what}: {drawing.help}." for what, drawing in FIGURES.items()),
        f"{What.PLAN}: a plan in time.",
        "Of a sweep:",
        *(f"{what}: {drawing.help}." for what, drawing in SWEPT_FIGURES.items()),
    ]
)
DRAWINGS = {**FIGURES, **SWEPT_FIGURES}
_OF_IMAGES = [what for what, drawing in DRAWINGS.items() if drawing.of_image]
OF_IMAGES = f"{', '.join(_OF_IMAGES[:-1])} and {_OF_IMAGES[-1]}"

PRODUCT = Annotated[
    str,
    argument(
        "PRODUCT.nc",
        "A product of `tracer run` or `tracer sweep`; for --what plan the table that `tracer plan` wrote.",
    ),
]
WHAT = Annotated[What, option("FIGURE", HELP)]
OUTPUT = Annotated[
    str,
    option("FILE", f"The figure; its ending says its kind: {', '.join(FIGURE_ENDINGS)}.", "--output", "-o"),
]
IMAGE = Annotated[
    str | None,
    option(
        "NAME",
        "Which image, by its name in the run file or the product; needed where there are several.",
        "--image",
    ),
]
LINE = Annotated[
    str | None,
    option(
        "NAME",
        "Draw image, tail or velocity in the brightness of this line; otherwise in column density.",
    ),
]
RELEASE = Annotated[str | None, option("NAME", "Draw one release; otherwise the sum over all of them.")]
FATE = Annotated[str | None, option("NAME", "Of a sweep: the share of one fate, such as escaped.")]
PLACE = Annotated[
    str | None,
    option(
        "LATITUDE,HOUR",
        "Of a sweep: the place whose column is drawn, in degrees and hours of local time; by default the "
        "means of day and night side.",
    ),
]
SKY = Annotated[
    str | None,
    option(
        "RIGHT,UP",
        "Of a sweep: the line of sight, by its place in the image from the body's centre, in body radii; by "
        "default the brightest of the first point.",
    ),
]
LEVEL = Annotated[
    float | None,
    option("NUMBER", "Of a sweep: down to what a tail counts, in kR, or in cm-2 without --line."),
]
WIDTH = Annotated[
    WidthName, typer.Option(help="column: 88 mm, one column of a journal. full: 180 mm, the whole page.")
]
DPI = Annotated[int, typer.Option(min=50, max=1200, help="Pixels per inch.")]
