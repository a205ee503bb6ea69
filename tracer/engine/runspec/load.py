"""Read and check a run file."""

import os
from collections.abc import Iterable
from typing import Any

from tracer.engine.runspec.overrides import override
from tracer.engine.runspec.run import RunSpec
from tracer.errors import InputError
from tracer.inputs.checking import checked
from tracer.inputs.toml import file_text, tables

SWEEP = "sweep"
"""The table that makes a run file a sweep file."""


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
    return parse_run(file_text(path, "run file"), path, overrides)


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
    given = tables(text, name)
    if SWEEP in given:
        raise InputError(
            f"{name}: {SWEEP}: makes this a sweep file, not a run file; tracer sweep traces it, with --check checks it"
        )
    for change in overrides:
        given = override(given, change)
    return checked_run(given, name)


def checked_run(given: dict[str, Any], file: str) -> RunSpec:
    """Check the tables of a run file, as TOML gives them; `file` is its name, as in `parse_run`.

    Raises
    ------
    InputError
        They cannot be used; the message says file, key, value and what is allowed.
    """
    return checked(RunSpec, given, file)
