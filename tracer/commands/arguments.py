"""Arguments and options that several commands share."""

from typing import Annotated

import typer

RUN_FILE = Annotated[str, typer.Argument(metavar="RUN.toml", help="The run file.", show_default=False)]

PRODUCT_FILE = Annotated[
    str, typer.Argument(metavar="PRODUCT.nc", help="A product of `tracer run`.", show_default=False)
]

SETTINGS = Annotated[
    list[str] | None,
    typer.Option(
        "--set",
        metavar="KEY=VALUE",
        help="Change a key of the run file, for example --set release[1].rate='2e24 s-1'. May be repeated.",
        show_default=False,
    ),
]

OVERWRITE = Annotated[bool, typer.Option("--overwrite", help="Replace an existing output.")]

JSON = Annotated[
    bool, typer.Option("--json", help="Print the figures for machines: SI units, angles in degrees.")
]
