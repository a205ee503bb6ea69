"""The one place that turns validation errors into the project's words."""

import difflib
import re
from collections.abc import Mapping, Sequence
from typing import Any, NamedTuple

from pydantic import ValidationError
from pydantic.fields import FieldInfo
from pydantic_core import ErrorDetails

from tracer.inputs.kinds import example, kind, law_name, tables_in
from tracer.inputs.table import Table, fields_of
from tracer.units import quoted

_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_NO_ARTICLE = ('"', "text", "true or false")
_UNKNOWN, _OTHER, _MISSING = range(3)
"""Ranks of problems: unknown keys come first and missing ones last, since a key misspelt is both."""


class Place(NamedTuple):
    """Where in the file an error lies."""

    key: str
    """Path as the user would write it, lists counted from 1."""
    parent: str
    """Path of the table that holds the last key."""
    table: type[Table]
    """What that table may hold."""
    field: FieldInfo | None
    """The last key's field; None where the table has no such key."""


class Problem(NamedTuple):
    """One thing wrong with one key."""

    rank: int
    key: str
    reason: str
    taken_for: str = ""
    """Path of the key that an unknown one was probably meant to be."""


def validation_message(error: ValidationError, root: type[Table], given: Mapping[str, Any]) -> str:
    """Return the first problem as `KEY: what is wrong`, and how many more there are.

    Parameters
    ----------
    error : ValidationError
        What pydantic found.
    root : type[Table]
        The table that was validated.
    given : Mapping
        What was given to it.
    """
    found = [_problem(details, root, given) for details in error.errors(include_url=False)]
    meant = {problem.taken_for for problem in found}
    kept = [problem for problem in found if problem.rank != _MISSING or problem.key not in meant]
    unique = sorted(dict.fromkeys(kept), key=lambda problem: problem.rank)
    first, more = unique[0], len(unique) - 1
    tail = f" (and {more} more problem{'s' if more > 1 else ''})" if more else ""
    return f"{first.key}: {first.reason}{tail}"


def join_key(path: str, key: str) -> str:
    """Return the path of `key` in the table at `path`, quoted where TOML would have it quoted."""
    shown = key if _BARE_KEY.fullmatch(key) else quoted(key)
    return f"{path}.{shown}" if path else shown


def _problem(details: ErrorDetails, root: type[Table], given: Mapping[str, Any]) -> Problem:
    place = _locate(details["loc"], root)
    value = details["input"]
    context = details.get("ctx", {})
    match details["type"]:
        case "extra_forbidden":
            return _unknown_key(place, str(details["loc"][-1]))
        case "missing" if isinstance(details["loc"][-1], int):
            return Problem(_OTHER, place.key.rpartition("[")[0], _wrong_length(place, value))
        case "too_long":
            return Problem(_OTHER, place.key, _wrong_length(place, value))
        case "missing":
            return Problem(_MISSING, place.key, f"missing; must be {_due(place)}")
        case "value_error":
            return Problem(_OTHER, place.key, str(context["error"]))
        case "conflict":
            path = f"{place.key}.{context['key']}" if place.key else str(context["key"])
            return Problem(_OTHER, path, str(context["reason"]))
        case "union_tag_invalid" | "union_tag_not_found":
            return _unknown_law(place, value, _value_at(details["loc"], given))
        case _:
            return Problem(_OTHER, place.key, f"{quoted(value)} is not allowed; must be {_due(place, value)}")


def _locate(location: Sequence[int | str], root: type[Table]) -> Place:
    place = Place("", "", root, None)
    candidates: tuple[type[Table], ...] = (root,)
    for step in location:
        if isinstance(step, int):
            place = place._replace(key=f"{place.key}[{step + 1}]")
        elif len(candidates) > 1:
            # Where a field has several laws pydantic puts the law's name into the location; it is no key.
            candidates = tuple(candidate for candidate in candidates if law_name(candidate) == step)
        else:
            field = fields_of(candidates[0]).get(step)
            place = Place(join_key(place.key, step), place.key, candidates[0], field)
            candidates = tables_in(field.annotation) if field else ()
    return place


def _unknown_key(place: Place, key: str) -> Problem:
    known = list(fields_of(place.table))
    close = difflib.get_close_matches(key, known, n=1, cutoff=0.7)
    if close:
        hint = f"did you mean {close[0]}?"
        return Problem(_UNKNOWN, place.key, f"unknown key; {hint}", join_key(place.parent, close[0]))
    return Problem(_UNKNOWN, place.key, f"unknown key; allowed here: {', '.join(known)}")


def _unknown_law(place: Place, value: Any, written: Any) -> Problem:
    laws = [law_name(table) for table in tables_in(place.field.annotation)] if place.field else []
    allowed = f"must be one of {', '.join(quoted(law) for law in laws)}"
    # A law written by its name alone has no key of its own.
    key = place.key if isinstance(written, str) else f"{place.key}.law"
    if "law" not in value:
        return Problem(_MISSING, key, f"missing; {allowed}")
    close = difflib.get_close_matches(str(value["law"]), laws, n=1, cutoff=0.7)
    hint = f"did you mean {quoted(close[0])}?" if close else allowed
    return Problem(_OTHER, key, f"{quoted(value['law'])} is not a law; {hint}")


def _wrong_length(place: Place, value: Any) -> str:
    entries = "1 entry" if len(value) == 1 else f"{len(value)} entries"
    return f"{quoted(value)} has {entries}; must be {_due(place)}"


def _due(place: Place, value: Any = None) -> str:
    """Return in words what the key takes, with what the wrong `value` suggests."""
    words = kind(place.field) if place.field else "table"
    if words == "list of tables":
        return f"a list of tables, each headed [[{place.key}]]"
    if words == "table" and isinstance(value, list | tuple):
        # No heading leads into one table of a list.
        return "one table in braces" if "[" in place.key else f"one table, headed [{place.key}]"
    hint = f", for example {example(place.field)}" if place.field and example(place.field) else ""
    return f"{words if words.startswith(_NO_ARTICLE) else 'a ' + words}{hint}"


def _value_at(location: Sequence[int | str], given: Any) -> Any:
    """Return what was written at a location, before a law's name became a table."""
    for step in location:
        given = given[step]
    return given
