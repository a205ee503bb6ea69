"""The commands that a user is likely to want next, quoted for a shell."""

import shlex
from collections.abc import Sequence

import typer

from tracer.commands.arguments import Tracing


def name_next(*words: str, settings: Sequence[str] | None = None) -> None:
    """Print, on standard error, the command `tracer` with `words` and the same --set `settings`."""
    typer.echo(f"Next: {shlex.join(['tracer', *words, *_changes(settings or ())])}", err=True)


def resuming_command(*words: str, tracing: Tracing) -> str:
    """Return the command `tracer` with `words` that goes on with an interrupted `tracing`."""
    options = {"--cluster": tracing.cluster, "--log": tracing.log, "--workers": tracing.workers}
    given = [part for name, value in options.items() if value is not None for part in (name, str(value))]
    overwrite = ["--overwrite"] if tracing.overwrite else []
    return shlex.join(["tracer", *words, *given, *_changes(tracing.settings), *overwrite, "--resume"])


def _changes(settings: Sequence[str]) -> list[str]:
    return [part for setting in settings for part in ("--set", setting)]
