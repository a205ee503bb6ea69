"""A product from its file."""

import os
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import xarray as xr

from tracer.errors import InputError
from tracer.product.assembling import with_label_indexes
from tracer.product.inspecting import why_suspicious
from tracer.product.layout import why_no_product
from tracer.product.netcdf import small_caches
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
    name = os.fspath(path)
    _check_signature(name)
    try:
        with netCDF4.Dataset(name) as file:
            attributes = {key: file.getncattr(key) for key in file.ncattrs()}
            reason = (
                why_no_product(attributes, file.variables)
                or _why_incomplete(attributes)
                or why_suspicious(file, os.path.getsize(name))
            )
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
