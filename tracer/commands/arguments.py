"""Arguments and options that several commands share."""

from collections.abc import Sequence
from typing import Annotated, Any, NamedTuple

import typer


def argument(metavar: str, words: str) -> Any:
    """Return an argument, with `words` of help that say what is meant where it is left out."""
    return typer.Argument(metavar=metavar, help=words, show_default=False)


def option(metavar: str, words: str, *names: str) -> Any:
    """Return an option, by default named as its parameter; its `words` of help say what holds without it."""
    return typer.Option(*names, metavar=metavar, help=words, show_default=False)


RUN_FILE = Annotated[str, argument("RUN.toml", "The run file.")]

PRODUCT_FILE = Annotated[str, argument("PRODUCT.nc", "A product of `tracer run`.")]

SETTINGS = Annotated[
    list[str] | None,
    option(
        "KEY=VALUE",
        "Change a key of the run file, for example --set release[1].rate='2e24 s-1'. May be repeated.",
        "--set",
    ),
]

OVERWRITE = Annotated[bool, typer.Option("--overwrite", help="Replace an existing output.")]

WORKERS = Annotated[
    int | None,
    typer.Option(
        min=1, help="Threads to trace on; by default all processors. The product does not depend on it."
    ),
]

CLUSTER = Annotated[
    str | None,
    option(
        "WHERE", "Trace on Dask workers: local:N, tcp://HOST:PORT, tls://HOST:PORT or a scheduler FILE.json."
    ),
]

LOG = Annotated[str | None, option("FILE", "Append one JSON line an event.")]

JSON = Annotated[
    bool, typer.Option("--json", help="Print the figures for machines: SI units, angles in degrees.")
]


class Tracing(NamedTuple):
    """How to trace, as the options that `tracer run` and `tracer sweep` share say."""

    workers: int | None
    cluster: str | None
    log: str | None
    settings: Sequence[str]
    overwrite: bool
    resume: bool
