"""Read a launch-speed distribution from a CSV file."""

from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from tracer.engine.two_columns import read_two_columns
from tracer.errors import InputError


def read_speed_table(path: Path) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return (speed [m s-1], pdf) of a CSV file of two columns.

    Raises
    ------
    InputError
        The file cannot be read, a row is not two finite numbers, speeds do not rise from 0 or above, the pdf is
        negative or zero everywhere.
    """
    rows = read_two_columns(path, "speed in m/s, pdf", "m/s")
    if rows[0].first < 0.0:
        raise InputError(f"line {rows[0].line}: speed {rows[0].first:g} must be at least 0 m/s")
    for row in rows:
        if row.second < 0.0:
            raise InputError(f"line {row.line}: pdf {row.second:g} must be at least 0")
    if not any(row.second for row in rows):
        raise InputError("has no flux: the pdf is 0 everywhere")
    speed, pdf = np.array([row.first for row in rows]), np.array([row.second for row in rows])
    with np.errstate(over="ignore"):
        flux = np.trapezoid(pdf, speed)
    if not np.isfinite(flux):
        raise InputError("its speeds or pdf are too large to be summed")
    return speed, pdf
