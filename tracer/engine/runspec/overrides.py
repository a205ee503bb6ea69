"""Changes of single keys from the command line, `--set key=value`."""

import re
import tomllib
from typing import Any

from tracer.errors import InputError
from tracer.units import quoted

_STEP = re.compile(r"(?P<key>[A-Za-z0-9_-]+)(?:\[(?P<number>[0-9]{1,9})\])?")


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
    path, equals, value = change.partition("=")
    if not equals:
        raise InputError(f"--set {quoted(change)}: must be key=value")
    steps = [_step(part.strip(), change) for part in path.split(".")]
    return _changed_table(given, steps, _value(value.strip()), change)


def _step(part: str, change: str) -> tuple[str, int | None]:
    match = _STEP.fullmatch(part)
    if match is None:
        raise InputError(
            f"--set {quoted(change)}: {quoted(part)} is not a key; write for example "
            "release[1].speed.temperature=1300 K"
        )
    return match["key"], int(match["number"]) if match["number"] else None


def _changed_table(
    table: Any, steps: list[tuple[str, int | None]], value: Any, change: str
) -> dict[str, Any]:
    (key, number), rest = steps[0], steps[1:]
    if not isinstance(table, dict):
        raise InputError(f"--set {quoted(change)}: there is no table that could hold {key}")
    if number is None:
        new = _changed_table(table.get(key, {}), rest, value, change) if rest else value
        return {**table, key: new}
    entries = table.get(key, [])
    if not isinstance(entries, list) or not 1 <= number <= len(entries):
        there = (
            f"there are {len(entries)}, counted from 1" if isinstance(entries, list) else f"{key} is no list"
        )
        raise InputError(f"--set {quoted(change)}: there is no {key}[{number}]; {there}")
    old = entries[number - 1]
    new = _changed_table(old, rest, value, change) if rest else value
    return {**table, key: [*entries[: number - 1], new, *entries[number:]]}


def _value(text: str) -> Any:
    try:
        tables = tomllib.loads(f"value = {text}")
    except (tomllib.TOMLDecodeError, RecursionError):
        return text
    # A line end in the text could smuggle in further keys.
    return tables["value"] if len(tables) == 1 else text
