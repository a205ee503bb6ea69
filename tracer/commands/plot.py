"""`tracer plot`: a figure of a product."""

from enum import StrEnum
from typing import Annotated

import typer

from tracer.commands.arguments import OVERWRITE, PRODUCT_FILE
from tracer.commands.figure_file import ENDINGS, check_figure_file
from tracer.commands.input_guard import refuse_inputs
from tracer.commands.next_command import name_next
from tracer.errors import InputError
from tracer.plots.density import density
from tracer.plots.image import image
from tracer.plots.ledger import ledger
from tracer.plots.saving import DOTS_PER_INCH, figure_bytes
from tracer.plots.style import Width
from tracer.plots.vertical_column import vertical_column
from tracer.product.layout import REPLICATES
from tracer.product.lock import output_lock
from tracer.product.reading import load_all, open_product
from tracer.product.writing import save_bytes


class What(StrEnum):
    """The figures."""

    COLUMN = "column"
    DENSITY = "density"
    IMAGE = "image"
    LEDGER = "ledger"


class WidthName(StrEnum):
    """The widths of a figure."""

    COLUMN = "column"
    FULL = "full"


FIGURES = {What.COLUMN: vertical_column, What.DENSITY: density, What.LEDGER: ledger}
"""Figures that take no more than a product, a release and a width."""


def command(
    product: PRODUCT_FILE,
    what: Annotated[
        What,
        typer.Option(
            help="column: above the ground, over latitude and local time. density: in the equatorial and the "
            "noon-midnight plane. image: as a viewer sees it. ledger: the particle budget.",
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
            help="Draw the image in the brightness of this line; otherwise in column density.",
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
    """Draw one figure of a product, ready for a paper, as PNG, PDF or SVG."""
    for option, value in (("--image", image_name), ("--line", line)):
        if value is not None and what is not What.IMAGE:
            raise InputError(f"{option}: goes with --what image alone, not with --what {what}")
    refuse_inputs(output, [product])
    ending = check_figure_file("--output", output, overwrite)
    chosen: Width = "column" if width is WidthName.COLUMN else "full"
    with output_lock(output), open_product(product) as stored:
        ds = stored.drop_vars([name for name in stored.data_vars if _is_spared(str(name))])
        load_all(ds, product)
        try:
            if what is What.IMAGE:
                figure = image(ds, image_name, line, release, chosen)
            else:
                figure = FIGURES[what](ds, release, chosen)
        except InputError as error:
            raise InputError(f"{product}: {error}") from None
        save_bytes(figure_bytes(figure, ending, dpi), output, overwrite)
    typer.echo(output)
    # A budget is the last thing to look at; before it, it is the likely next, and after an image its lines of sight.
    if what is What.LEDGER:
        name_next("summary", product)
    elif what is What.IMAGE:
        name_next("sightlines", product, "RAYS.csv")
    else:
        name_next("plot", product, "--what", What.LEDGER, "-o", "ledger.png")


def _is_spared(name: str) -> bool:
    """Return whether a variable needs not be read: replicates, most of a product, serve the planes of density alone."""
    return name.endswith(REPLICATES) and name != "number_density" + REPLICATES
