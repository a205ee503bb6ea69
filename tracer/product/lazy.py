"""Arrays whose values are computed when they are read."""

from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from xarray.backends import BackendArray
from xarray.core import indexing

Key = tuple[int | slice, ...]
Reader = Callable[[Key], NDArray[Any]]


def lazy_variable(
    dimensions: Sequence[Any],
    shape: tuple[int, ...],
    dtype: np.dtype[Any],
    read: Reader,
    attributes: Mapping[Any, Any],
) -> xr.Variable:
    """Return a variable that holds nothing: `read` computes the values under a key of whole numbers and slices."""
    return xr.Variable(
        dimensions, indexing.LazilyIndexedArray(_Computed(shape, dtype, read)), dict(attributes)
    )


class _Computed(BackendArray):
    def __init__(self, shape: tuple[int, ...], dtype: np.dtype[Any], read: Reader) -> None:
        self.shape = shape
        self.dtype = dtype
        self._read = read

    def __getitem__(self, key: indexing.ExplicitIndexer) -> Any:
        return indexing.explicit_indexing_adapter(key, self.shape, indexing.IndexingSupport.BASIC, self._read)
