"""What a user is likely to want next."""

import shlex
from collections.abc import Sequence

import typer


def name_next(*words: str, settings: Sequence[str] | None = None) -> None:
    """Print, on standard error, the command `tracer` with `words` and the same --set `settings`, quoted for a shell."""
    changes = [part for setting in settings or () for part in ("--set", setting)]
    typer.echo(f"Next: {shlex.join(['tracer', *words, *changes])}", err=True)
