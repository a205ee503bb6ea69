"""The command `tracer`: a table of commands, each loaded only when it is asked for."""

import sys
from collections.abc import Callable, Sequence
from functools import wraps
from importlib import import_module
from typing import Annotated, Any, NamedTuple

import typer

from tracer.errors import Interrupted, TracerError


class Entry(NamedTuple):
    """A command's name, its line in the overview, and the module that holds its function `command`."""

    name: str
    help: str
    module: str


COMMANDS = (
    Entry("new", "Write a commented run file to start from.", "tracer.commands.new"),
    Entry(
        "check",
        "Validate a run file and print the resolved scene, without running it.",
        "tracer.commands.check",
    ),
    Entry(
        "retention",
        "Say which gases a body keeps: escape, sunlight and wind against the age of the Solar System.",
        "tracer.commands.retention",
    ),
    Entry(
        "catalogue", "List the built-in bodies, gases and lines with sources.", "tracer.commands.catalogue"
    ),
    Entry("run", "Trace a run file's particles and write the product.", "tracer.commands.run"),
    Entry(
        "sweep",
        "Trace a run file over lists or ranges of its values, into one product.",
        "tracer.commands.sweep",
    ),
    Entry("flight", "Follow one flight from a stated launch to its end.", "tracer.commands.flight"),
    Entry("merge", "Merge products of one scene, made with other seeds or batches.", "tracer.commands.merge"),
    Entry("summary", "Say what is in a product: budget, errors, checksum.", "tracer.commands.summary"),
    Entry(
        "sightlines",
        "Add up column, brightness and optical depth along lines of sight.",
        "tracer.commands.sightlines",
    ),
    Entry(
        "plan",
        "Plan a spectrometer observation along a path: counts, SNR, keep-outs.",
        "tracer.commands.plan",
    ),
    Entry(
        "compare",
        "Explain a measured profile by a product's sources: rates, law parameters, how sure.",
        "tracer.commands.compare",
    ),
    Entry("plot", "Draw a figure of a product: density, column, image, budget.", "tracer.commands.plot"),
    Entry("report", "Write one page about a product, to hand round.", "tracer.commands.report"),
)

EPILOG = (
    "Begin with: tracer retention, tracer new, tracer check, tracer run. Results are a planning aid: flight rules and "
    "the responsible team come first."
)


def main(arguments: Sequence[str] | None = None) -> None:
    """Run the command line; exit codes are 0 done, 2 bad input, 3 interrupted, 1 anything else."""
    words = list(sys.argv[1:] if arguments is None else arguments)
    asked = next((word for word in words if not word.startswith("-")), None)
    try:
        _application(asked)(words, prog_name="tracer")
    except TracerError as error:
        typer.echo(f"tracer: {error}", err=True)
        sys.exit(error.exit_code)
    except KeyboardInterrupt:
        typer.echo("tracer: interrupted", err=True)
        sys.exit(Interrupted.exit_code)
    except MemoryError:
        typer.echo(
            "tracer: out of memory; fewer cells, pixels or workers need less, see tracer check", err=True
        )
        sys.exit(TracerError.exit_code)


def _application(asked: str | None) -> typer.Typer:
    app = typer.Typer(
        name="tracer",
        help="Trace the thin gas of airless bodies: from one run file to density, columns and escape.",
        epilog=EPILOG,
        add_completion=False,
        no_args_is_help=True,
        pretty_exceptions_enable=False,
    )
    app.callback()(_overall)
    for entry in COMMANDS:
        asked_for = entry.name == asked
        function = _interruptible(import_module(entry.module).command) if asked_for else _not_loaded
        app.command(entry.name, help=None if asked_for else entry.help, short_help=entry.help)(function)
    return app


def _interruptible(command: Callable[..., None]) -> Callable[..., None]:
    """Return `command` with Ctrl-C as an error of ours; the command-line library gives it another exit code."""

    @wraps(command)
    def run(*arguments: Any, **options: Any) -> None:
        try:
            command(*arguments, **options)
        except KeyboardInterrupt:
            raise Interrupted("interrupted") from None

    return run


def _not_loaded() -> None:
    """Stand for a command that was not asked for: enough for the overview."""


def _show_version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"tracer {import_module('importlib.metadata').version('exosphere-tracer')}")
        raise typer.Exit


def _overall(
    version: Annotated[
        bool,
        typer.Option("--version", callback=_show_version, is_eager=True, help="Show the version and exit."),
    ] = False,
) -> None:
    del version


if __name__ == "__main__":
    main()
