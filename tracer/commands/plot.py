"""`tracer plot`: a figure of a product."""

from enum import StrEnum
from typing import Annotated

import typer

from tracer.commands.arguments import OVERWRITE
from tracer.commands.figure_file import ENDINGS, check_figure_file
from tracer.commands.input_guard import refuse_inputs
from tracer.commands.next_command import name_next
from tracer.errors import InputError
from tracer.plots.figures import FIGURES, Choice, What
from tracer.plots.plan_table import read_plan
from tracer.plots.saving import DOTS_PER_INCH, figure_bytes
from tracer.plots.timeline import timeline
from tracer.product.layout import REPLICATES
from tracer.product.lock import output_lock
from tracer.product.reading import load_all, open_product
from tracer.product.writing import save_bytes


class WidthName(StrEnum):
    """The widths of a figure."""

    COLUMN = "column"
    FULL = "full"


HELP = " ".join(
    [*(f"{what}: {drawing.help}." for what, drawing in FIGURES.items()), f"{What.PLAN}: a plan in time."]
)
OF_VELOCITY = ("column_", "brightness_", "mean_velocity_", "velocity_width_", "line_shift_", "line_width_")
"""Beginnings of the variables that the figure of velocities needs."""
_OF_IMAGES = [what for what, drawing in FIGURES.items() if drawing.of_image]
OF_IMAGES = f"{', '.join(_OF_IMAGES[:-1])} and {_OF_IMAGES[-1]}"


def command(
    product: Annotated[
        str,
        typer.Argument(
            metavar="PRODUCT.nc",
            help="A product of `tracer run`; for --what plan the table that `tracer plan` wrote.",
            show_default=False,
        ),
    ],
    what: Annotated[
        What,
        typer.Option(
            metavar="FIGURE",
            help=HELP,
            show_default=False,
        ),
    ],
    output: Annotated[
        str,
        typer.Option(
            "--output",
            "-o",
            metavar="FILE",
            help=f"The figure; its ending says its kind: {', '.join(ENDINGS)}.",
            show_default=False,
        ),
    ],
    image_name: Annotated[
        str | None,
        typer.Option(
            "--image",
            metavar="NAME",
            help="Which image, by its name in the run file or the product; needed where there are several.",
            show_default=False,
        ),
    ] = None,
    line: Annotated[
        str | None,
        typer.Option(
            metavar="NAME",
            help="Draw image, tail or velocity in the brightness of this line; otherwise in column density.",
            show_default=False,
        ),
    ] = None,
    release: Annotated[
        str | None,
        typer.Option(
            metavar="NAME", help="Draw one release; otherwise the sum over all of them.", show_default=False
        ),
    ] = None,
    width: Annotated[
        WidthName, typer.Option(help="column: 88 mm, one column of a journal. full: 180 mm, the whole page.")
    ] = WidthName.FULL,
    dpi: Annotated[int, typer.Option(min=50, max=1200, help="Pixels per inch.")] = DOTS_PER_INCH,
    overwrite: OVERWRITE = False,
) -> None:
    """Draw one figure of a product, or of a plan, ready for a paper, as PNG, PDF or SVG."""
    for option, value, goes, words in (
        ("--image", image_name, _of_image(what), OF_IMAGES),
        ("--line", line, _of_image(what), OF_IMAGES),
        ("--release", release, what is not What.PLAN, "figures of a product"),
    ):
        if value is not None and not goes:
            raise InputError(f"{option}: goes with --what {words}, not with --what {what}")
    refuse_inputs(output, [product])
    ending = check_figure_file("--output", output, overwrite)
    choice = Choice(release, image_name, line, "column" if width is WidthName.COLUMN else "full")
    with output_lock(output):
        if what is What.PLAN:
            content = figure_bytes(timeline(read_plan(product), choice.width), ending, dpi)
        else:
            content = _of_product(product, what, choice, ending, dpi)
        save_bytes(content, output, overwrite)
    typer.echo(output)
    if what is What.PLAN:
        name_next("report", "PRODUCT.nc", product, "-o", "report.html")
    else:
        name_next("report", product, "-o", "report.html")


def _of_image(what: What) -> bool:
    return what in FIGURES and FIGURES[what].of_image


def _of_product(product: str, what: What, choice: Choice, ending: str, dpi: int) -> bytes:
    with open_product(product) as stored:
        ds = stored.drop_vars([name for name in map(str, stored.data_vars) if _is_spared(name, what)])
        load_all(ds, product)
        try:
            return figure_bytes(FIGURES[what].draw(ds, choice), ending, dpi)
        except InputError as error:
            raise InputError(f"{product}: {error}") from None


def _is_spared(name: str, what: What) -> bool:
    """Return whether a variable needs not be read: replicates, most of a product, where no use is made of them."""
    if not name.endswith(REPLICATES):
        return False
    if what is What.TAIL:
        return not name.startswith(("column_", "brightness_"))
    if what is What.VELOCITY:
        return not name.startswith(OF_VELOCITY)
    return what not in (What.DENSITY, What.PROFILE) or name != "number_density" + REPLICATES
