"""Read and check a run file."""

import os
import re
import tomllib
from collections.abc import Iterable
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from tracer.engine.runspec.messages import validation_message
from tracer.engine.runspec.overrides import override
from tracer.engine.runspec.run import RunSpec
from tracer.errors import InputError

_SYNTAX = re.compile(r"(?P<what>.*?) \((?P<where>at .*)\)", re.DOTALL)
_PLAIN_WORDS = (
    (re.compile(r"Cannot overwrite a value"), "this key is already given"),
    (re.compile(r"Cannot declare .* twice", re.DOTALL), "this table is already given"),
)


def load_run(path: str | os.PathLike[str], overrides: Iterable[str] = ()) -> RunSpec:
    """Read a run file.

    Parameters
    ----------
    path : path
        A TOML file, UTF-8 with or without byte-order mark.
    overrides : iterable of str
        Changes such as `release[1].speed.temperature=1300 K`, applied before the file is checked.

    Returns
    -------
    RunSpec
        The checked file with its defaults filled in; `folder` is where the file lies.

    Raises
    ------
    InputError
        The file cannot be read or used; the message says file, key, value and what is allowed.
    """
    name = os.fspath(path)
    return parse_run(_decoded(_content(name), name), name, overrides)


def parse_run(text: str, file: str | os.PathLike[str], overrides: Iterable[str] = ()) -> RunSpec:
    """Check the text of a run file.

    Parameters
    ----------
    text : str
        TOML.
    file : path
        Name for messages; relative paths of the run file begin in its folder. It need not exist.
    overrides : iterable of str
        As in `load_run`.

    Returns
    -------
    RunSpec
        The checked file with its defaults filled in.

    Raises
    ------
    InputError
        The text is no TOML or cannot be used; the message says file, key, value and what is allowed.
    """
    name = os.fspath(file)
    given = _tables(text, name)
    for change in overrides:
        given = override(given, change)
    try:
        return RunSpec.model_validate(given, context={"file": name})
    except ValidationError as error:
        raise InputError(f"{name}: {validation_message(error, RunSpec, given)}") from None


def _content(name: str) -> bytes:
    try:
        return Path(name).read_bytes()
    except FileNotFoundError:
        raise InputError(f"{name}: no such file") from None
    except IsADirectoryError:
        raise InputError(f"{name}: is a folder; must be a run file") from None
    except PermissionError:
        what = "is a folder; must be a run file" if Path(name).is_dir() else "no permission to read it"
        raise InputError(f"{name}: {what}") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise InputError(f"{name}: cannot be read: {reason}") from None


def _decoded(content: bytes, name: str) -> str:
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line, byte = content.count(b"\n", 0, error.start) + 1, content[error.start]
        raise InputError(
            f"{name}: line {line}: byte 0x{byte:02x} is not UTF-8; save the file as UTF-8 text"
        ) from None


def _tables(text: str, name: str) -> dict[str, Any]:
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise InputError(f"{name}: {_syntax_message(str(error))}") from None
    except RecursionError:
        raise InputError(f"{name}: lists or tables are nested too deeply") from None


def _syntax_message(message: str) -> str:
    match = _SYNTAX.fullmatch(message)
    if match is None:
        return f"not TOML: {message}"
    what, where = match["what"], match["where"].removeprefix("at ")
    for pattern, words in _PLAIN_WORDS:
        what = pattern.sub(words, what)
    return f"{where}: not TOML: {what[:1].lower()}{what[1:]}"
