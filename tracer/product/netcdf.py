"""A Dataset into a netCDF-4 file, one chunk at a time: what is not in memory stays out of it."""

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import xarray as xr

from tracer.product.checksum import TEXT_KINDS, ProductDigest
from tracer.product.layout import BOUNDS
from tracer.product.slabs import CHUNK_BYTES, chunk_shape

COMPRESSION = {"zlib": True, "complevel": 1, "shuffle": True}

CACHE_BYTES = 2 * CHUNK_BYTES
"""What the library may keep of a variable: chunks are passed one after the other, and a file has many variables."""


@contextmanager
def small_caches() -> Iterator[None]:
    """Let files that are opened meanwhile keep `CACHE_BYTES` of each variable instead of the library's 64 MB."""
    usual = netCDF4.get_chunk_cache()
    netCDF4.set_chunk_cache(size=CACHE_BYTES)
    try:
        yield
    finally:
        netCDF4.set_chunk_cache(*usual)


def write_netcdf(ds: xr.Dataset, path: Path) -> str:
    """Write a Dataset to a new file and return its `data_checksum`.

    Parameters
    ----------
    ds : xarray.Dataset
        In memory or lazy; its variables' encoding does not count.
    path : Path
        The file, which must not exist.

    Raises
    ------
    OSError, RuntimeError
        Where the file cannot be written.
    """
    with netCDF4.Dataset(path, "w", format="NETCDF4", clobber=False) as file:
        file.setncatts(ds.attrs)
        for dimension, size in ds.sizes.items():
            file.createDimension(str(dimension), size)
        variables = ds.variables
        stored = {str(name): _define(file, str(name), variables[name], ds) for name in variables}
        digest = ProductDigest()
        for name in sorted(stored):
            for place, values in digest.passing(name, variables[name]):
                stored[name][place if values.ndim else ...] = values
    return digest.hexdigest()


def _define(file: Any, name: str, variable: xr.Variable, ds: xr.Dataset) -> Any:
    text = variable.dtype.kind in TEXT_KINDS
    options: dict[str, Any] = {}
    if not text and variable.ndim:
        options = {
            **COMPRESSION,
            "chunksizes": chunk_shape(variable.shape, variable.dtype.itemsize),
            "chunk_cache": CACHE_BYTES,
        }
    bare = name in ds.coords or name.endswith(BOUNDS)
    fill = np.nan if variable.dtype.kind == "f" and not bare else None
    kind = str if text else variable.dtype.newbyteorder("=")
    stored = file.createVariable(name, kind, variable.dims, fill_value=fill, **options)
    stored.set_auto_maskandscale(False)
    labels = _labels(name, variable, ds)
    stored.setncatts({**variable.attrs, **({"coordinates": labels} if labels else {})})
    return stored


def _labels(name: str, variable: xr.Variable, ds: xr.Dataset) -> str:
    """Return the auxiliary coordinates of a variable, as CF's attribute `coordinates` names them."""
    if name in ds.coords:
        return ""
    fitting = (
        str(label)
        for label, coordinate in ds.coords.items()
        if label not in ds.dims and set(coordinate.dims) <= set(variable.dims)
    )
    return " ".join(sorted(fitting))
