"""Read a launch-speed distribution from a CSV file."""

import csv
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from tracer.errors import InputError


def read_speed_table(path: Path) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return (speed [m s-1], pdf) of a CSV file of two columns; a first line of words is a heading.

    Raises
    ------
    InputError
        The file cannot be read, a row is not two finite numbers, speeds do not rise from 0 or above, the pdf is
        negative or zero everywhere.
    """
    rows = _numbers(path)
    if len(rows) < 2:
        raise InputError(f"has {len(rows)} rows of numbers; at least 2 are needed")
    speed, pdf = np.array([row for _, row in rows]).T
    for (line, _), low, high in zip(rows[1:], speed[:-1], speed[1:], strict=True):
        if not low < high:
            raise InputError(f"line {line}: speed {high:g} does not rise above {low:g}")
    if speed[0] < 0.0:
        raise InputError(f"line {rows[0][0]}: speed {speed[0]:g} must be at least 0 m/s")
    for (line, _), value in zip(rows, pdf, strict=True):
        if value < 0.0:
            raise InputError(f"line {line}: pdf {value:g} must be at least 0")
    if not pdf.any():
        raise InputError("has no flux: the pdf is 0 everywhere")
    return speed, pdf


def _numbers(path: Path) -> list[tuple[int, tuple[float, float]]]:
    try:
        text = path.read_text(encoding="utf-8-sig")
    except (OSError, UnicodeDecodeError) as error:
        raise InputError(f"cannot be read: {getattr(error, 'strerror', None) or 'not UTF-8'}") from None
    rows: list[tuple[int, tuple[float, float]]] = []
    headed = False
    for line, cells in enumerate(csv.reader(text.splitlines()), 1):
        if not cells or cells[0].lstrip().startswith("#"):
            continue
        try:
            speed, pdf = (float(cell) for cell in cells)
        except ValueError:
            if rows or headed:
                raise InputError(
                    f"line {line}: {','.join(cells)!r} is not two numbers: speed in m/s, pdf"
                ) from None
            headed = True
            continue
        if not np.isfinite([speed, pdf]).all():
            raise InputError(f"line {line}: {','.join(cells)!r} is not finite")
        rows.append((line, (speed, pdf)))
    return rows
