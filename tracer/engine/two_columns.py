"""Read a CSV file of two columns of numbers."""

import csv
import re
from itertools import pairwise
from pathlib import Path
from types import MappingProxyType
from typing import NamedTuple

import numpy as np

from tracer.errors import InputError


class Row(NamedTuple):
    """Two numbers and the `line` of the file, from 1, where they stand."""

    line: int
    first: float
    second: float


FOREIGN_UNITS = MappingProxyType(
    {
        "m/s": re.compile(r"km|cm|ev", re.IGNORECASE),
        "km/s": re.compile(r"cm|(?<!k)m ?[/_ ] ?s", re.IGNORECASE),
    }
)
"""What a heading must not hold where the first column is in the given unit."""


def read_two_columns(path: Path, columns: str, unit: str) -> list[Row]:
    """Return the rows of a CSV file, at least two of them.

    Parameters
    ----------
    path : Path
        UTF-8 text; lines that begin with `#` are passed over, and so is one line of words before the numbers.
    columns : str
        What the columns are, for messages, for example "speed in m/s, pdf".
    unit : str
        Unit of the first column, "m/s" or "km/s"; a heading that names another one is refused.

    Raises
    ------
    InputError
        The file cannot be read, or a row is not two finite numbers; the message names the line, not the file.
    """
    rows: list[Row] = []
    headed = False
    for line, cells in enumerate(_split(_text(path)), 1):
        if not cells or cells[0].lstrip().startswith("#"):
            continue
        shown = ",".join(cells)
        try:
            first, second = (float(cell) for cell in cells)
        except ValueError:
            if rows or headed:
                raise InputError(f"line {line}: {shown!r} is not two numbers: {columns}") from None
            _check_heading(line, shown, unit)
            headed = True
            continue
        if not np.isfinite([first, second]).all():
            raise InputError(f"line {line}: {shown!r} is not finite")
        rows.append(Row(line, first, second))
    if len(rows) < 2:
        raise InputError(f"has {len(rows)} rows of numbers; at least 2 are needed")
    for low, high in pairwise(rows):
        if not low.first < high.first:
            raise InputError(f"line {high.line}: {high.first:g} does not rise above {low.first:g}")
    return rows


def _check_heading(line: int, heading: str, unit: str) -> None:
    if FOREIGN_UNITS[unit].search(heading):
        raise InputError(
            f"line {line}: the heading {heading!r} names another unit; the first column is in {unit}"
        )


def _split(text: str) -> list[list[str]]:
    try:
        return list(csv.reader(text.splitlines()))
    except csv.Error as error:
        raise InputError(f"cannot be read: {error}") from None


def _text(path: Path) -> str:
    try:
        return path.read_text(encoding="utf-8-sig")
    except OSError as error:
        raise InputError(f"cannot be read: {error.strerror}") from None
    except UnicodeDecodeError:
        raise InputError("cannot be read: not UTF-8") from None
