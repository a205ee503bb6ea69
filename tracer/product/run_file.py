"""The run file inside a product: its tables, and what two of them differ in."""

import tomllib
from collections.abc import Iterator, Mapping
from typing import Any

from tracer.units import parse, si

Table = Mapping[str, Any]

WITHOUT_PHYSICS = ("title", "ensemble")
"""Keys that are no part of the scene."""


def tables_of(text: str) -> Table:
    """Return a run file's `text` as tables; empty where it is none that can be read."""
    try:
        return tomllib.loads(text)
    except (tomllib.TOMLDecodeError, RecursionError):
        return {}


def table(parent: Table, key: str) -> Table:
    """Return the table under `key`; empty where there is none."""
    inner = parent.get(key)
    return inner if isinstance(inner, dict) else {}


def entries(parent: Table, key: str) -> list[Table]:
    """Return the list of tables under `key`; empty where there is none."""
    inner = parent.get(key)
    return [one for one in inner if isinstance(one, dict)] if isinstance(inner, list) else []


def value(parent: Table, key: str, dimension: str, radius: float | None = None) -> float | None:
    """Return the quantity under `key` in SI units, angles in degrees; None where it is no such quantity.

    `radius` [m] of the body is needed where it may be in radii.
    """
    try:
        return si(parse(parent.get(key), dimension), radius)
    except ValueError:
        return None


def differing_keys(first: str, second: str) -> list[str]:
    """Return the keys of the scene in which two run files differ, with both values; lists count from 1."""
    one, other = (dict(_leaves("", tables_of(text))) for text in (first, second))
    keys = [key for key in dict.fromkeys([*one, *other]) if one.get(key) != other.get(key)]
    return [f"{key} ({_shown(one.get(key))} and {_shown(other.get(key))})" for key in keys]


def replicates_wanted(text: str) -> int:
    """Return the replicates that a run file asks for, 0 where it does not say."""
    wanted = table(tables_of(text), "ensemble").get("replicates", 0)
    return wanted if isinstance(wanted, int) else 0


def _leaves(path: str, value: Any) -> Iterator[tuple[str, Any]]:
    if isinstance(value, dict):
        for key, inner in value.items():
            if path or key not in WITHOUT_PHYSICS:
                yield from _leaves(f"{path}.{key}" if path else key, inner)
    elif isinstance(value, list) and any(isinstance(inner, dict) for inner in value):
        for number, inner in enumerate(value, 1):
            yield from _leaves(f"{path}[{number}]", inner)
    else:
        yield path, value


def _shown(value: Any) -> str:
    return "absent" if value is None else f'"{value}"' if isinstance(value, str) else str(value)
