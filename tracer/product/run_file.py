"""The run file inside a product: what two of them differ in."""

import tomllib
from collections.abc import Iterator
from typing import Any

WITHOUT_PHYSICS = ("title", "ensemble")
"""Keys that are no part of the scene."""


def differing_keys(first: str, second: str) -> list[str]:
    """Return the keys of the scene in which two run files differ, with both values; lists count from 1."""
    one, other = (dict(_leaves("", _tables(text))) for text in (first, second))
    keys = [key for key in dict.fromkeys([*one, *other]) if one.get(key) != other.get(key)]
    return [f"{key} ({_shown(one.get(key))} and {_shown(other.get(key))})" for key in keys]


def replicates_wanted(text: str) -> int:
    """Return the replicates that a run file asks for, 0 where it does not say."""
    ensemble = _tables(text).get("ensemble", {})
    wanted = ensemble.get("replicates", 0) if isinstance(ensemble, dict) else 0
    return wanted if isinstance(wanted, int) else 0


def _tables(text: str) -> dict[str, Any]:
    try:
        return tomllib.loads(text)
    except (tomllib.TOMLDecodeError, RecursionError):
        return {}


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
