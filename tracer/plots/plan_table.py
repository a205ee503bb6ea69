"""What `tracer plan` wrote, read back: a row for each exposure."""

import math
import os
import re
from collections.abc import Mapping
from datetime import datetime
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import xarray as xr
from astropy.table import Table
from numpy.typing import NDArray

from tracer.errors import InputError

TEXT_FORMATS = {".csv": "ascii.csv", ".ecsv": "ascii.ecsv"}
FORBIDDEN = "do_not_command"
FLAGS: Mapping[str, str] = {
    FORBIDDEN: "not to be commanded",
    "sun_keep_out": "Sun inside keep-out",
    "body_keep_out": "body inside keep-out",
    "body_in_field": "body in the field",
    "saturated": "saturated",
    "thick": "optically thick",
    "outside_grid": "leaves the grid",
}
"""Columns of flags and their words, the gravest first."""
NEEDED = ("time", "snr", FORBIDDEN)
_BRIGHTNESS = re.compile(r"brightness_(.+?)(_standard_error)?_rayleigh")
_TRUTHS = {"True": True, "False": False}


class PlanTable(NamedTuple):
    """A plan: columns by name, each of shape (N,) and of numbers, truth values or texts, and what is said of them."""

    columns: Mapping[str, NDArray[Any]]
    notes: Mapping[str, str]

    @property
    def rows(self) -> int:
        """Number of exposures."""
        return len(self.columns["time"])

    @property
    def lines(self) -> list[str]:
        """Emission lines, as the columns of brightness name them."""
        found = [_BRIGHTNESS.fullmatch(name) for name in self.columns]
        return [match[1] for match in found if match and not match[2]]

    def numbers(self, name: str) -> NDArray[np.float64]:
        """Return a column as numbers; NaN where there is no such column or a row has none."""
        column = self.columns.get(name)
        if column is None or column.dtype.kind not in "biuf":
            return np.full(self.rows, math.nan)
        return np.asarray(column, dtype=np.float64)

    def flags(self, name: str) -> NDArray[np.bool_]:
        """Return a column of flags; false where there is no such column."""
        column = self.columns.get(name)
        if column is None:
            return np.zeros(self.rows, dtype=bool)
        return np.asarray(column == "True") if column.dtype.kind == "U" else column.astype(bool)

    def moments(self) -> list[datetime] | NDArray[np.float64]:
        """Return the times as dates, or as numbers where they are such; else the numbers of the exposures."""
        times = self.columns["time"]
        if times.dtype.kind in "iuf":
            return np.asarray(times, dtype=np.float64)
        try:
            return [datetime.fromisoformat(str(text).removesuffix("Z")) for text in times]
        except ValueError:
            return np.arange(1.0, self.rows + 1.0)


def read_plan(path: str | os.PathLike[str]) -> PlanTable:
    """Read what `tracer plan` wrote, as ECSV, CSV or netCDF by the file's ending.

    Raises
    ------
    InputError
        The file cannot be read, has another ending, or is no such table.
    """
    name, ending = os.fspath(path), Path(path).suffix.lower()
    if ending not in (*TEXT_FORMATS, ".nc"):
        raise InputError(f"{name}: has none of the endings of a plan: {', '.join([*TEXT_FORMATS, '.nc'])}")
    if not Path(name).is_file():
        raise InputError(f"{name}: no such file")
    try:
        table = _from_netcdf(name) if ending == ".nc" else _from_text(name, TEXT_FORMATS[ending])
    except Exception as error:
        reason = " ".join(str(error).split())[:200] or type(error).__name__
        raise InputError(f"{name}: cannot be read as a table: {reason}") from None
    missing = [column for column in NEEDED if column not in table.columns]
    if missing:
        raise InputError(f"{name}: is no result of tracer plan: it has no column {', '.join(missing)}")
    if not table.rows:
        raise InputError(f"{name}: has no rows")
    return table


def _from_text(name: str, form: str) -> PlanTable:
    options = {"guess": False} if form == "ascii.csv" else {}
    text = Path(name).read_bytes().decode("utf-8-sig")
    table = Table.read(text.splitlines(), format=form, **options)
    columns = {str(one): _plain(table[one]) for one in table.colnames}
    return PlanTable(columns, {str(key): str(note) for key, note in table.meta.items()})


def _from_netcdf(name: str) -> PlanTable:
    with xr.open_dataset(name, decode_times=False) as ds:
        columns = {str(one): np.asarray(ds[one].values) for one in ds.variables}
        texts = {one: values.astype(str) for one, values in columns.items() if values.dtype.kind == "O"}
        truths = {
            one: values.astype(bool)
            for one, values in columns.items()
            if values.dtype.kind == "i" and values.dtype.itemsize == 1
        }
        return PlanTable({**columns, **texts, **truths}, {str(key): str(v) for key, v in ds.attrs.items()})


def _plain(column: Any) -> NDArray[Any]:
    """Return a table's column as an array; texts that are all True or False as truth values."""
    if np.ma.isMaskedArray(column):
        # A gap among whole numbers: they become numbers that can have one.
        numbers: Any = column.astype(np.float64) if column.dtype.kind in "iuf" else None
        column = column.filled("") if numbers is None else numbers.filled(np.nan)
    array = np.asarray(column)
    if array.dtype.kind not in "OSU":
        return array
    array = array.astype(str)
    if array.size and set(array.tolist()) <= set(_TRUTHS):
        return np.array([_TRUTHS[text] for text in array.tolist()])
    return array
