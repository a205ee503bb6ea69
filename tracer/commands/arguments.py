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

CLUSTER = Annotated[
    str | None,
    typer.Option(
        metavar="WHERE",
        help="Trace on Dask workers: local:N, tcp://HOST:PORT, tls://HOST:PORT or a scheduler FILE.json.",
        show_default=False,
    ),
]

LOG = Annotated[
    str | None,
    typer.Option(metavar="FILE", help="Append one JSON line an event.", show_default=False),
]

JSON = Annotated[
    bool, typer.Option("--json", help="Print the figures for machines: SI units, angles in degrees.")
]
