"""What "the same product" means: one number over all variables and coordinates."""

from hashlib import sha256
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.product.assembling import without_label_indexes

TEXT = "text"


def data_checksum(ds: xr.Dataset) -> str:
    """Return the SHA-256 over all variables and coordinates of a product.

    Each variable enters by name, in sorted order, with its dimensions, type, shape and values (little-endian,
    in C order; strings in UTF-8). Attributes, chunks, compression, the order in the file and the indexes that
    `open_product` adds do not count, and one NaN is like another, since a file keeps no NaN's bits.

    Parameters
    ----------
    ds : xarray.Dataset
        A product, in memory or opened from its file; one variable at a time is read.

    Returns
    -------
    str
        64 hexadecimal digits.
    """
    stored = without_label_indexes(ds)
    digest = sha256()
    for name in sorted(map(str, stored.variables)):
        variable = stored.variables[name]
        values = np.asarray(variable.values)
        kind, content = _text(values) if values.dtype.kind in "OUT" else _numbers(values)
        for part in (name, *map(str, variable.dims), kind, str(values.shape)):
            digest.update(_framed(part.encode()))
        digest.update(_framed(content))
    return digest.hexdigest()


def _numbers(values: NDArray[Any]) -> tuple[str, bytes]:
    if values.dtype.kind == "f":
        values = np.where(np.isnan(values), values.dtype.type(np.nan), values)
    little = values.astype(values.dtype.newbyteorder("<"), order="C", copy=False)
    return f"{values.dtype.kind}{values.dtype.itemsize}", little.tobytes()


def _text(values: NDArray[Any]) -> tuple[str, bytes]:
    return TEXT, b"".join(_framed(str(value).encode()) for value in values.ravel())


def _framed(content: bytes) -> bytes:
    """Return the content behind its length, so that no two lists of parts read alike."""
    return len(content).to_bytes(8, "little") + content
