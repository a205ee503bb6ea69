"""A figure into its file."""

import os
import secrets
from contextlib import suppress
from pathlib import Path
from typing import Any, Protocol

from tracer.errors import InputError, TracerError
from tracer.units import quoted

ENDINGS = (".png", ".pdf", ".svg")


class Savable(Protocol):
    """What a figure can do."""

    def savefig(self, fname: str, **options: Any) -> None:
        """Write the figure."""


def check_figure_file(option: str, path: str, overwrite: bool) -> None:
    """Refuse a figure's file that cannot be made, before any work is done for it; InputError says why."""
    target = Path(path)
    if target.suffix.lower() not in ENDINGS:
        raise InputError(
            f"{option}: {quoted(path)} has none of the endings of a figure: {', '.join(ENDINGS)}"
        )
    if not target.parent.is_dir():
        raise InputError(f"{path}: there is no folder {target.parent}")
    if target.is_dir():
        raise InputError(f"{path}: exists and is not a file")
    if target.exists() and not overwrite:
        raise InputError(f"{path}: exists; --overwrite replaces it, or name another output")
    if not os.access(target.parent, os.W_OK | os.X_OK):
        raise InputError(f"{path}: cannot write in {target.parent}: Permission denied")


def write_figure(figure: Savable, path: str) -> None:
    """Write `figure` in the format of the file's ending; the file appears whole or not at all.

    Raises
    ------
    TracerError
        Where it cannot be written.
    """
    target = Path(os.path.realpath(path))
    beside = target.with_name(f".{secrets.token_hex(6)}.part")
    try:
        figure.savefig(str(beside), format=target.suffix.lower().lstrip("."))
        os.replace(beside, target)
    except OSError as error:
        raise TracerError(f"{path}: cannot be written: {os.strerror(error.errno or 0)}") from None
    finally:
        with suppress(FileNotFoundError):
            beside.unlink()
