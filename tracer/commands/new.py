"""`tracer new`: a run file to start from."""

import os
from pathlib import Path
from typing import Annotated

import typer

from tracer.commands.next_command import name_next
from tracer.engine.runspec.template import run_file_template
from tracer.errors import InputError

SUFFIX = ".toml"


def command(
    name: Annotated[
        str, typer.Argument(help="Name of the run; the file gets the ending .toml if it has none.")
    ] = "harrow-helium",
) -> None:
    """Write a commented run file to start from, in the current folder; it runs as it is."""
    if not name.isprintable() or not Path(name).stem.strip(". "):
        raise InputError(
            f"{name!r} cannot name a run; use printable characters, at least one before the ending"
        )
    path = Path(name if name.lower().endswith(SUFFIX) else name + SUFFIX)
    try:
        # "x" refuses an existing file in the same moment as it makes a new one.
        with open(path, "x", encoding="utf-8") as file:
            file.write(run_file_template(path.stem))
    except FileExistsError:
        raise InputError(f"{path}: exists already; give another name") from None
    except OSError as error:
        raise InputError(f"{path}: cannot be written: {os.strerror(error.errno or 0)}") from None
    typer.echo(path)
    name_next("check", str(path))
