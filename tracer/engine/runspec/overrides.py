"""Changes of single keys of a run file: `--set key=value` on the command line, the axes of a sweep."""

import re
import tomllib
from typing import Any

from tracer.errors import InputError
from tracer.units import quoted

_STEP = re.compile(r"(?P<key>[A-Za-z0-9_-]+)(?:\[(?P<number>[0-9]{1,9})\])?")


Steps = list[tuple[str, int | None]]


def override(given: dict[str, Any], change: str) -> dict[str, Any]:
    """Return a copy of a run file's tables with one key changed.

    Parameters
    ----------
    given : dict
        Tables as TOML gives them.
    change : str
        `key=value`: a dotted path with lists counted from 1, and a TOML value; what is no TOML value is text.

    Returns
    -------
    dict
        Changed where the path leads, shared elsewhere. Keys and tables missing on the path are made.

    Raises
    ------
    InputError
        No `=`, a path that is none, or one that leads through a value or to a list entry that does not exist.
    """
    subject = f"--set {quoted(change)}"
    path, equals, value = change.partition("=")
    if not equals:
        raise InputError(f"{subject}: must be key=value")
    return with_value(given, key_steps(path, subject), _value(value.strip()), subject)


def key_steps(path: str, subject: str) -> Steps:
    """Return the keys on a dotted `path`, each with its place in a list, from 1; `subject` begins messages.

    Raises
    ------
    InputError
        A path that is none.
    """
    return [_step(part.strip(), subject) for part in path.split(".")]


def with_value(given: Any, steps: Steps, value: Any, subject: str) -> dict[str, Any]:
    """Return a copy of the table `given` with `value` where the `steps` lead; `subject` begins messages.

    Raises
    ------
    InputError
        The path leads through a value or to a list entry that does not exist.
    """
    (key, number), rest = steps[0], steps[1:]
    if not isinstance(given, dict):
        raise InputError(f"{subject}: there is no table that could hold {key}")
    if number is None:
        new = with_value(given.get(key, {}), rest, value, subject) if rest else value
        return {**given, key: new}
    entries = given.get(key, [])
    if not isinstance(entries, list) or not 1 <= number <= len(entries):
        there = (
            f"there are {len(entries)}, counted from 1" if isinstance(entries, list) else f"{key} is no list"
        )
        raise InputError(f"{subject}: there is no {key}[{number}]; {there}")
    old = entries[number - 1]
    new = with_value(old, rest, value, subject) if rest else value
    return {**given, key: [*entries[: number - 1], new, *entries[number:]]}


def _step(part: str, subject: str) -> tuple[str, int | None]:
    match = _STEP.fullmatch(part)
    if match is None:
        raise InputError(
            f"{subject}: {quoted(part)} is not a key; write for example release[1].speed.temperature"
            f"{'=1300 K' if subject.startswith('--set') else ''}"
        )
    return match["key"], int(match["number"]) if match["number"] else None


def _value(text: str) -> Any:
    try:
        tables = tomllib.loads(f"value = {text}")
    except (tomllib.TOMLDecodeError, RecursionError):
        return text
    # A line end in the text could smuggle in further keys.
    return tables["value"] if len(tables) == 1 else text
