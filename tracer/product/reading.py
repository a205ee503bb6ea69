"""A product from its file."""

import os
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import xarray as xr

from tracer.errors import InputError
from tracer.product.assembling import with_label_indexes
from tracer.product.inspecting import Swept, why_suspicious
from tracer.product.layout import why_no_product
from tracer.product.netcdf import small_caches
from tracer.product.sweep_layout import FIXED, KIND, NAME, POINT_TEXTS, SWEEP, swept_dimensions, why_no_sweep
from tracer.product.writing import COMPLETE

SIGNATURE = b"\x89HDF\r\n\x1a\n"
"""First bytes of every netCDF-4 file."""


def open_product(path: str | os.PathLike[str]) -> xr.Dataset:
    """Open a product; its arrays are read when they are asked for.

    The dimensions `release`, `fate` and `line` get indexes from their label variables, so that
    `ds.ledger.sel(fate="escaped")` works.

    Parameters
    ----------
    path : path
        A file that `save_product` or `tracer run` wrote.

    Raises
    ------
    InputError
        Where the file is missing, not netCDF-4, damaged, not a product, incomplete, or of a version that this
        package does not know.
    """
    return _opened(path, _why_no_run)


def open_sweep(path: str | os.PathLike[str]) -> xr.Dataset:
    """Open the product of a sweep; its arrays are read when they are asked for.

    Its variables are those of a run behind the swept dimensions; `sweep_point` takes out the run of one point. Beside
    the dimensions that `open_product` indexes, a swept dimension whose values are words gets an index as well.

    Parameters
    ----------
    path : path
        A file that `run_sweep` or `tracer sweep` wrote.

    Raises
    ------
    InputError
        As `open_product`, and where the file is the product of a run.
    """
    ds = _opened(path, _why_no_sweep)
    named = {axis: axis + NAME for axis in swept_dimensions(ds.attrs) if axis + NAME in ds.variables}
    indexed = ds.assign_coords({axis: ds[name].values.astype(object) for axis, name in named.items()})
    indexed.set_close(ds.close)
    return indexed


def is_sweep(path: str | os.PathLike[str]) -> bool:
    """Return whether a file says of itself that it is the product of a sweep; whatever cannot be read is none."""
    try:
        with netCDF4.Dataset(os.fspath(path)) as file:
            return bool(KIND in file.ncattrs() and file.getncattr(KIND) == SWEEP)
    except (OSError, RuntimeError, ValueError, KeyError, AttributeError):
        return False


def _opened(
    path: str | os.PathLike[str], why_not: Callable[[Any, Mapping[str, Any], int], str | None]
) -> xr.Dataset:
    name = os.fspath(path)
    _check_signature(name)
    try:
        with netCDF4.Dataset(name) as file:
            attributes = {key: file.getncattr(key) for key in file.ncattrs()}
            reason = why_not(file, attributes, os.path.getsize(name))
        if reason:
            raise InputError(f"{name}: {reason}")
        # A mean life in seconds stays a number: nothing in a product is a date.
        with small_caches():
            ds = xr.open_dataset(Path(path), engine="netcdf4", decode_times=False)
    except (OSError, RuntimeError, ValueError, KeyError, AttributeError) as error:
        raise InputError(
            f"{name}: is damaged or cut short and cannot be read ({_first_line(error)})"
        ) from error
    indexed = with_label_indexes(ds)
    indexed.set_close(ds.close)
    return indexed


def _why_no_run(file: Any, attributes: Mapping[str, Any], size: int) -> str | None:
    return (
        why_no_product(attributes, file.variables)
        or _why_incomplete(attributes)
        or why_suspicious(file, size)
    )


def _why_no_sweep(file: Any, attributes: Mapping[str, Any], size: int) -> str | None:
    dimensions = swept_dimensions(attributes)
    # Paired axes lie along one dimension, so that their variables' names are not those of dimensions.
    words = {
        name for name, one in file.variables.items() if one.dtype is str and one.dimensions in zip(dimensions)
    }
    swept = Swept(dimensions, frozenset({*POINT_TEXTS, *words}), frozenset(FIXED))
    return (
        why_no_sweep(attributes, file.variables)
        or _why_incomplete(attributes)
        or why_suspicious(file, size, swept)
    )


def load_all(ds: xr.Dataset, path: str | os.PathLike[str]) -> None:
    """Read every array of the product opened from `path` into memory.

    Raises
    ------
    InputError
        Where the file's data are damaged, which shows only on reading them.
    """
    try:
        ds.load()
    except (OSError, RuntimeError, ValueError) as error:
        raise InputError(
            f"{os.fspath(path)}: is damaged: its data cannot be read ({_first_line(error)})"
        ) from error


def _check_signature(name: str) -> None:
    try:
        with open(name, "rb") as file:
            start = file.read(len(SIGNATURE))
    except FileNotFoundError:
        raise InputError(f"{name}: no such file") from None
    except IsADirectoryError:
        raise InputError(f"{name}: is a folder, not a product") from None
    except OSError as error:
        raise InputError(f"{name}: cannot be read: {error.strerror}") from None
    if start != SIGNATURE:
        raise InputError(f"{name}: is not a netCDF-4 file")


def _why_incomplete(attributes: Mapping[str, Any]) -> str | None:
    if np.array_equal(attributes.get(COMPLETE, 0), 1):
        return None
    return "is incomplete: writing it was not finished"


def _first_line(error: Exception) -> str:
    text = getattr(error, "strerror", None) or str(error) or type(error).__name__
    return str(text).splitlines()[0]
