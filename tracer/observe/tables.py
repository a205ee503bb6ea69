"""Tables that a user hands in: CSV or ECSV files, columns checked, rows counted from 1."""

import csv
import math
import os
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
from astropy.table import Table
from astropy.time import Time
from astropy.units import Unit
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.units import quoted

Floats = NDArray[np.float64]

FORMATS = {".csv": "ascii.csv", ".ecsv": "ascii.ecsv"}
"""How a table is read, by the ending of its file."""

UNITS = {"_km": "km", "_deg": "deg", "_h": "h", "_s": "s", "_m": "m"}
"""Units that endings of columns stand for; a column of an ECSV file in another unit is converted."""


def read_table(path: str | os.PathLike[str]) -> Table:
    """Read a CSV or ECSV file with at least one row; lines of a CSV file that begin with `#` are comments.

    Raises
    ------
    InputError
        The file cannot be read, has another ending, or is no such table.
    """
    name = os.fspath(path)
    form = FORMATS.get(Path(name).suffix.lower())
    if form is None:
        raise InputError(f"{name}: has none of the endings of a table: {', '.join(FORMATS)}")
    try:
        text = Path(name).read_bytes().decode("utf-8-sig")
    except FileNotFoundError:
        raise InputError(f"{name}: no such file") from None
    except UnicodeDecodeError:
        raise InputError(f"{name}: is not UTF-8 text") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise InputError(f"{name}: cannot be read: {reason}") from None
    table = _parsed(text.splitlines(), form, name)
    if not len(table):
        raise InputError(f"{name}: has no rows")
    return table


def _parsed(lines: list[str], form: str, name: str) -> Table:
    options = {}
    if form == FORMATS[".csv"]:
        lines = [line for line in lines if not line.startswith("#")]
        _refuse_repeated_columns(lines, name)
        # A single column has no delimiter that could be guessed, and a comma is what the ending promises.
        options = {"guess": False}
    try:
        return Table.read(lines, format=form, **options)
    except Exception as error:
        reason = " ".join(str(error).split())[:200] or type(error).__name__
        raise InputError(f"{name}: is not a table of columns: {reason}") from None


def _refuse_repeated_columns(lines: list[str], name: str) -> None:
    heads = [head.strip() for head in next(csv.reader(lines[:1]), [])]
    twice = next((head for head in heads if heads.count(head) > 1), None)
    if twice is not None:
        raise InputError(f"{name}: column {twice or quoted(twice)}: stands there twice")


def has_columns(table: Table, names: Sequence[str]) -> bool:
    """Return whether the table has any of these columns."""
    return any(name in table.colnames for name in names)


def numbers(table: Table, name: str, low: float = -math.inf, high: float = math.inf) -> Floats:
    """Return column `name` as finite numbers from `low` to `high`, in the unit that its name ends with.

    Raises
    ------
    InputError
        The column is missing, or has an entry that is missing, no number, not finite or out of range.
    """
    if name not in table.colnames:
        raise InputError(f"column {name}: missing; the table has {', '.join(table.colnames)}")
    column = table[name]
    if np.shape(column) != (len(table),):
        raise InputError(f"column {name}: must hold one number a row")
    mask = np.ma.getmaskarray(np.ma.asarray(column))
    if mask.any():
        raise InputError(f"row {int(np.argmax(mask)) + 1}, column {name}: missing; must be a finite number")
    values = _floats(column, name) * _factor(column, name)
    for wrong, allowed in (
        (~np.isfinite(values), "a finite number"),
        ((values < low) | (values > high), f"from {low:g} to {high:g}"),
    ):
        if wrong.any():
            row = int(np.argmax(wrong))
            raise InputError(
                f"row {row + 1}, column {name}: {values[row]:g} is not allowed; must be {allowed}"
            )
    return values


def vectors(table: Table, names: Sequence[str]) -> Floats:
    """Return columns as vectors, shape (rows, columns); errors as `numbers`."""
    return np.stack([numbers(table, name) for name in names], axis=1)


def check_times(table: Table, strictly: bool) -> None:
    """Refuse a column `time` that does not rise, or that rises not `strictly`; without one nothing is checked.

    Times are numbers of seconds, or dates as ISO 8601 writes them.

    Raises
    ------
    InputError
        With the first row that is no time, or is not later than the row above it.
    """
    if "time" not in table.colnames:
        return
    values = times(table)
    steps = np.diff(values)
    wrong = ~(steps > 0.0) if strictly else ~(steps >= 0.0)
    if wrong.any():
        row = int(np.argmax(wrong)) + 1
        later = "later" if strictly else "earlier"
        raise InputError(
            f"row {row + 1}, column time: {table['time'][row]} is {'not ' if strictly else ''}{later} than "
            f"{table['time'][row - 1]} in row {row}; times must rise"
        )


def times(table: Table) -> Floats:
    """Return column `time` as numbers that rise with it: as they stand, or seconds of dates after the first one."""
    column = table["time"]
    if isinstance(column, Time):
        return np.asarray((column - column[0]).sec, dtype=np.float64)
    if np.asarray(column).dtype.kind not in "USO":
        return numbers(table, "time")
    texts = [str(text).removesuffix("Z") for text in column]
    try:
        moments = _moment(texts)
    except ValueError:
        for row, text in enumerate(texts, 1):
            try:
                _moment(text)
            except ValueError:
                raise InputError(
                    f"row {row}, column time: {quoted(text)} is no time; must be a number, or a date such as "
                    "2031-06-01T12:00:00"
                ) from None
        raise
    return np.asarray((moments - moments[0]).sec, dtype=np.float64)


def column_values(column: Any) -> NDArray[Any]:
    """Return a column as an array of numbers, truth values or texts; times as ISO 8601 writes them."""
    if isinstance(column, Time):
        return np.asarray(column.isot)
    if np.ma.isMaskedArray(column):
        # A missing entry stays one: no number stands for it, and in texts nothing does.
        if column.dtype.kind in "iuf":
            return np.ma.filled(np.ma.asarray(column, dtype=np.float64), np.nan)
        return np.asarray(["" if entry is np.ma.masked else str(entry) for entry in column])
    array = np.asarray(column)
    return array.astype(str) if array.dtype.kind in "OS" else array


def _moment(text: str | list[str]) -> Any:
    # Without leap seconds: which years will have them is not known, and only the order counts here.
    return Time(text, scale="tt")


def _floats(column: Any, name: str) -> Floats:
    try:
        return np.asarray(column, dtype=np.float64)
    except (ValueError, TypeError):
        # Which entry it was NumPy does not say.
        pass
    for row, entry in enumerate(column, 1):
        try:
            float(entry)
        except (ValueError, TypeError):
            raise InputError(
                f"row {row}, column {name}: {quoted(str(entry))} is not a number; must be a finite number"
            ) from None
    raise InputError(f"column {name}: must hold numbers")


def _factor(column: Any, name: str) -> float:
    unit = getattr(column, "unit", None)
    due = next((word for ending, word in UNITS.items() if name.endswith(ending)), None)
    if unit is None or due is None:
        return 1.0
    try:
        return float(Unit(unit).to(due))
    except Exception:
        raise InputError(
            f"column {name}: its unit {quoted(str(unit))} is not one that becomes {due}"
        ) from None
