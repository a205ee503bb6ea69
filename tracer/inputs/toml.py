"""A file of TOML into tables, with messages that say file, line and what is wrong."""

import os
import re
import tomllib
from pathlib import Path
from typing import Any

from tracer.errors import InputError

_SYNTAX = re.compile(r"(?P<what>.*?) \((?P<where>at .*)\)", re.DOTALL)
_PLAIN_WORDS = (
    (re.compile(r"Cannot overwrite a value"), "this key is already given"),
    (re.compile(r"Cannot declare .* twice", re.DOTALL), "this table is already given"),
)


def file_text(path: str | os.PathLike[str], what: str) -> str:
    """Return the text of a UTF-8 file, with or without byte-order mark; `what` it should be, for messages.

    Raises
    ------
    InputError
        The file cannot be read.
    """
    name = os.fspath(path)
    return _decoded(_content(name, what), name)


def tables(text: str, name: str) -> dict[str, Any]:
    """Return the tables of a TOML `text`; `name` is the file's, for messages.

    Raises
    ------
    InputError
        The text is no TOML.
    """
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise InputError(f"{name}: {_syntax_message(str(error))}") from None
    except RecursionError:
        raise InputError(f"{name}: lists or tables are nested too deeply") from None


def _content(name: str, what: str) -> bytes:
    try:
        return Path(name).read_bytes()
    except FileNotFoundError:
        raise InputError(f"{name}: no such file") from None
    except IsADirectoryError:
        raise InputError(f"{name}: is a folder; must be a {what}") from None
    except PermissionError:
        problem = f"is a folder; must be a {what}" if Path(name).is_dir() else "no permission to read it"
        raise InputError(f"{name}: {problem}") from None
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


def _syntax_message(message: str) -> str:
    match = _SYNTAX.fullmatch(message)
    if match is None:
        return f"not TOML: {message}"
    what, where = match["what"], match["where"].removeprefix("at ")
    for pattern, words in _PLAIN_WORDS:
        what = pattern.sub(words, what)
    return f"{where}: not TOML: {what[:1].lower()}{what[1:]}"
