"""Sweeps of invented products, made as the program makes them."""

from collections.abc import Callable, Sequence
from contextlib import ExitStack

import numpy as np
import pytest
import xarray as xr

from tracer.product.checksum import data_checksum
from tracer.product.reading import open_sweep
from tracer.product.sweep_layout import KIND, SWEEP, SweptAxis
from tracer.product.sweeping import read_head, swept_product
from tracer.product.writing import save_product, save_sweep


def _axis(
    name: str, values: Sequence[float] | Sequence[str], dimension: str = "", **attributes: str
) -> SweptAxis:
    """Return an axis of numbers or words."""
    kind = object if isinstance(values[0], str) else np.float64
    notes = {"long_name": name.replace("_", " "), "run_file_key": f"some.{name}", **attributes}
    return SweptAxis(name, dimension or name, np.array(values, dtype=kind), notes)


@pytest.fixture(scope="session")
def axis() -> Callable[..., SweptAxis]:
    """Return a function that makes an axis of numbers or words."""
    return _axis


@pytest.fixture(scope="module")
def swept(tmp_path_factory: pytest.TempPathFactory) -> Callable[..., xr.Dataset]:
    """Return a function that makes a sweep's product of the products of its points, in their order, and opens it."""
    with ExitStack() as files:

        def make(points: Sequence[xr.Dataset], *axes: SweptAxis) -> xr.Dataset:
            folder = tmp_path_factory.mktemp("sweep")
            paths = [folder / f"{number}.nc" for number in range(len(points))]
            for product, path in zip(points, paths, strict=True):
                extra = {
                    "complete": 1,
                    "scene_hash": "0",
                    "run_hash": path.name,
                    "flights": 10,
                    "data_checksum": data_checksum(product),
                }
                save_product(product.assign_attrs(extra), path)
            known = points[0].attrs
            attributes = {key: known[key] for key in ("product_version", "title", "body_radius", "source")}
            output = folder / "sweep.nc"
            with swept_product([read_head(path) for path in paths], axes, {**attributes, KIND: SWEEP}) as ds:
                save_sweep(ds, output)
            return files.enter_context(open_sweep(output))

        yield make
