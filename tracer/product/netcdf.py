"""A Dataset into a netCDF-4 file, one chunk at a time: what is not in memory stays out of it."""

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import xarray as xr

from tracer.product.checksum import TEXT_KINDS, ProductDigest, data_checksum
from tracer.product.layout import BOUNDS
from tracer.product.slabs import CHUNK_BYTES, chunk_shape, slabs

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
    with _defined(ds, path) as stored:
        variables = ds.variables
        digest = ProductDigest()
        for name in sorted(stored):
            for place, values in digest.passing(name, variables[name]):
                stored[name][place if values.ndim else ...] = values
    return digest.hexdigest()


def write_by_points(ds: xr.Dataset, path: Path, swept: Sequence[str]) -> str:
    """Write a Dataset as `write_netcdf`, all that belongs to one point of its leading dimensions before the next.

    So a Dataset whose points lie in files of their own needs each of them once.

    Parameters
    ----------
    ds, path
        As in `write_netcdf`.
    swept : sequence of str
        The leading dimensions; variables that do not begin with them, or have no others, come first.
    """
    depth, variables = len(swept), ds.variables
    with _defined(ds, path) as stored:
        by_points = [
            name for name in stored if variables[name].dims[:depth] == tuple(swept) != variables[name].dims
        ]
        for name in stored.keys() - set(by_points):
            stored[name][...] = variables[name].values
        for point in np.ndindex(*(ds.sizes[axis] for axis in swept)):
            for name in by_points:
                one = variables[name]
                for place in slabs(one.shape[depth:], one.dtype.itemsize):
                    stored[name][(*point, *place)] = one[(*point, *place)].values
    with small_caches(), xr.open_dataset(path, engine="netcdf4", decode_times=False) as written:
        return data_checksum(written)


@contextmanager
def _defined(ds: xr.Dataset, path: Path) -> Iterator[dict[str, Any]]:
    """Yield the variables of a new file, with all but their values."""
    with netCDF4.Dataset(path, "w", format="NETCDF4", clobber=False) as file:
        file.setncatts(ds.attrs)
        for dimension, size in ds.sizes.items():
            file.createDimension(str(dimension), size)
        yield {str(name): _define(file, str(name), variable, ds) for name, variable in ds.variables.items()}


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
