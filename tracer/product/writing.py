"""A product into its file: written beside, marked complete last, synced and renamed."""

import errno
import os
import shutil
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from functools import partial
from pathlib import Path

import netCDF4
import numpy as np
import xarray as xr

from tracer.errors import InputError, TracerError
from tracer.product.assembling import without_label_indexes
from tracer.product.layout import why_no_product
from tracer.product.netcdf import write_by_points, write_netcdf
from tracer.product.replacing import put_in_place, sync, written_beside
from tracer.product.sweep_layout import swept_dimensions, why_no_sweep

COMPLETE = "complete"
CHECKSUM = "data_checksum"
MEGABYTE = 1e6
DISK_FULL = (errno.ENOSPC, errno.EDQUOT, errno.EFBIG)

StrPath = str | os.PathLike[str]


def save_product(ds: xr.Dataset, path: StrPath, overwrite: bool = False) -> None:
    """Write a product as netCDF-4; the file appears whole or not at all.

    Parameters
    ----------
    ds : xarray.Dataset
        A product, from a run, `open_product` or `merged_product`; what is not in memory is written chunk by chunk.
        Its `data_checksum` is computed anew.
    path : path
        The output.
    overwrite : bool
        Whether an existing file is replaced.

    Raises
    ------
    InputError
        Where the file exists and `overwrite` is not set, the folder is missing or not writable, or the
        Dataset is not a product.
    TracerError
        Where writing fails, as on a full disk; no half file is left.
    """
    _save(ds, path, overwrite, why_no_product(ds.attrs, ds.variables), write_netcdf)


def save_sweep(ds: xr.Dataset, path: StrPath, overwrite: bool = False) -> None:
    """Write the product of a sweep, as `save_product` writes that of a run, and with its errors."""
    write = partial(write_by_points, swept=swept_dimensions(ds.attrs))
    _save(ds, path, overwrite, why_no_sweep(ds.attrs, ds.variables), write)


def _save(
    ds: xr.Dataset,
    path: StrPath,
    overwrite: bool,
    reason: str | None,
    write: Callable[[xr.Dataset, Path], str],
) -> None:
    if reason:
        raise InputError(f"{os.fspath(path)}: the Dataset cannot be saved: {reason}")
    stored = without_label_indexes(ds)
    stored.attrs = {key: value for key, value in ds.attrs.items() if key not in (COMPLETE, CHECKSUM)}
    with _placed(path, overwrite, stored.nbytes) as beside:
        checksum = write(stored, beside)
        sync(beside)
        with netCDF4.Dataset(beside, "a") as file:
            file.setncattr(CHECKSUM, checksum)
            file.setncattr(COMPLETE, np.int32(1))


def save_bytes(content: bytes, path: StrPath, overwrite: bool = False) -> None:
    """Write what was made from a product, such as a figure; the file appears whole or not at all.

    Parameters
    ----------
    content : bytes
        All that the file will hold.
    path : path
        The output.
    overwrite : bool
        Whether an existing file is replaced.

    Raises
    ------
    InputError
        As `check_output`.
    TracerError
        Where writing fails, as on a full disk; no half file is left.
    """
    with _placed(path, overwrite, len(content)) as beside:
        beside.write_bytes(content)


def check_output(path: StrPath, overwrite: bool = False) -> None:
    """Refuse an output that cannot be made, before any work is done for it.

    Raises
    ------
    InputError
        Where the folder is missing or not writable, or the file exists and `overwrite` is not set, or what
        exists is not a plain file.
    """
    target = Path(os.path.realpath(path))
    if not os.fspath(path):
        raise InputError("the output has no name")
    if not os.fsencode(target).decode("utf-8", "ignore").encode() == os.fsencode(target):
        raise InputError(f"{os.fspath(path)!r}: the output's name is not UTF-8, which netCDF needs")
    if not target.parent.is_dir():
        raise InputError(f"{os.fspath(path)}: there is no folder {target.parent}")
    if target.exists() and not target.is_file():
        raise InputError(f"{os.fspath(path)}: exists and is not a file")
    if target.exists() and not overwrite:
        raise InputError(f"{os.fspath(path)}: exists; --overwrite replaces it, or name another output")
    if not os.access(target.parent, os.W_OK | os.X_OK):
        raise InputError(f"{os.fspath(path)}: cannot write in {target.parent}: Permission denied")


@contextmanager
def _placed(path: StrPath, overwrite: bool, size: int) -> Iterator[Path]:
    """Yield a file to write beside the output `path`, of up to `size` bytes, and put it in the output's place."""
    check_output(path, overwrite)
    target = Path(os.path.realpath(path))
    try:
        with written_beside(target) as beside:
            yield beside
            sync(beside)
            check_output(path, overwrite)
            put_in_place(beside, target)
    except (OSError, RuntimeError) as error:
        reason = _why_unwritten(error, target.parent, size)
        raise TracerError(f"{os.fspath(path)}: cannot be written: {reason}") from error


def _why_unwritten(error: OSError | RuntimeError, folder: Path, size: int) -> str:
    number = error.errno if isinstance(error, OSError) else None
    if number is not None and number > 0 and number not in DISK_FULL:
        return os.strerror(number)
    # The netCDF library names a full disk only as "HDF error", with no number of the system's.
    if not folder.is_dir():
        return f"there is no folder {folder}"
    free = shutil.disk_usage(folder).free
    return f"is the disk full? {free / MEGABYTE:.1f} MB free, up to {size / MEGABYTE:.1f} MB needed ({error})"
