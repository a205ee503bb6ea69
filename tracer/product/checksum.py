"""What "the same product" means: one number over all variables and coordinates."""

from collections.abc import Iterator
from hashlib import sha256
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.product.assembling import without_label_indexes
from tracer.product.slabs import slabs

TEXT = "text"
TEXT_KINDS = "OUT"
"""NumPy's letters for the types that hold text."""

Slab = tuple[slice, ...]


def data_checksum(ds: xr.Dataset) -> str:
    """Return the SHA-256 over all variables and coordinates of a product.

    Each variable enters by name, in sorted order, with its dimensions, type, shape and values (little-endian,
    in C order; strings in UTF-8). Attributes, chunks, compression, the order in the file and the indexes that
    `open_product` adds do not count, and one NaN is like another, since a file keeps no NaN's bits.

    Parameters
    ----------
    ds : xarray.Dataset
        A product, in memory or opened from its file; a chunk of one variable at a time is read.

    Returns
    -------
    str
        64 hexadecimal digits.
    """
    stored = without_label_indexes(ds)
    digest = ProductDigest()
    for name in sorted(map(str, stored.variables)):
        for _ in digest.passing(name, stored.variables[name]):
            pass
    return digest.hexdigest()


class ProductDigest:
    """The checksum while it is made, variable by variable in the order of their names."""

    def __init__(self) -> None:
        self._digest = sha256()

    def passing(self, name: str, variable: xr.Variable) -> Iterator[tuple[Slab, NDArray[Any]]]:
        """Yield a variable chunk by chunk, with its place, while it enters the checksum."""
        if variable.dtype.kind in TEXT_KINDS:
            values = np.asarray(variable.values)
            content = b"".join(_framed(str(value).encode()) for value in values.ravel())
            self._head(name, variable, TEXT)
            self._digest.update(_framed(content))
            yield (slice(None),) * variable.ndim, values
            return
        self._head(name, variable, f"{variable.dtype.kind}{variable.dtype.itemsize}")
        self._digest.update(_length(variable.size * variable.dtype.itemsize))
        for place in slabs(variable.shape, variable.dtype.itemsize):
            values = np.asarray(variable[place].values)
            self._digest.update(_number_bytes(values))
            yield place, values

    def hexdigest(self) -> str:
        """Return the checksum of all that has passed, 64 hexadecimal digits."""
        return self._digest.hexdigest()

    def _head(self, name: str, variable: xr.Variable, kind: str) -> None:
        for part in (name, *map(str, variable.dims), kind, str(variable.shape)):
            self._digest.update(_framed(part.encode()))


def _number_bytes(values: NDArray[Any]) -> bytes:
    if values.dtype.kind == "f":
        values = np.where(np.isnan(values), values.dtype.type(np.nan), values)
    return values.astype(values.dtype.newbyteorder("<"), order="C", copy=False).tobytes()


def _framed(content: bytes) -> bytes:
    """Return the content behind its length, so that no two lists of parts read alike."""
    return _length(len(content)) + content


def _length(size: int) -> bytes:
    return size.to_bytes(8, "little")
