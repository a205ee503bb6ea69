"""Text files that commands write: whole or not at all, and never over an existing one unasked."""

import os
import secrets
from collections.abc import Iterable
from contextlib import suppress
from pathlib import Path

from tracer.errors import InputError, TracerError


def write_text(path: str, text: str, overwrite: bool) -> None:
    """Write `text` as UTF-8 to `path`: written beside, then renamed.

    Raises
    ------
    InputError
        The file exists and `overwrite` is not set, or its folder is missing.
    TracerError
        Writing failed; no half file is left.
    """
    target = Path(path)
    if target.exists() and not overwrite:
        raise InputError(f"{path}: exists; --overwrite replaces it, or name another output")
    if not target.parent.is_dir():
        raise InputError(f"{path}: there is no folder {target.parent}")
    beside = target.with_name(f".{secrets.token_hex(6)}.part")
    try:
        beside.write_text(text, encoding="utf-8", newline="")
        os.replace(beside, target)
    except OSError as error:
        raise TracerError(f"{path}: cannot be written: {error.strerror}") from None
    finally:
        with suppress(OSError):
            beside.unlink()


def refuse_inputs(path: str, inputs: Iterable[str | os.PathLike[str]]) -> None:
    """Raise InputError where the output `path` is one of the `inputs`, which it would destroy."""
    for name in inputs:
        if os.path.realpath(path) == os.path.realpath(name):
            raise InputError(f"{path}: is read by this command; name another output")
