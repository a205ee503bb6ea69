"""Products of 500 million values: write two, merge them, read one, each in a process whose memory is measured."""

import os
import resource
import subprocess
import sys
import tempfile
import time
from collections.abc import Hashable
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

import tracer
from tracer.product.assembling import with_label_indexes, without_label_indexes
from tracer.product.lazy import Key, lazy_variable
from tracer.product.merging import merged_product

ROOT = Path(__file__).parents[3]
SMALL = """
title = "Large"
body = { name = "Ball", radius = "1000 km", gm = "3000 km3 s-2" }
gas = { species = "He" }
surface = { sticking = 1.0 }
domain = { outer_radius = "20 radii" }
grid = { altitude = { cells = 4 }, latitude_cells = 6, local_time_cells = 8 }
ensemble = { particles_per_batch = 100, batches = 20, replicates = 20, seed = SEED }
[[release]]
name = "vent"
rate = "1e20 s-1"
speed = { law = "maxwell-flux", temperature = "300 K" }
"""
SIZES = {"altitude": 96, "latitude": 180, "local_time": 1440}


def small_product(seed: int) -> xr.Dataset:
    """Return a traced product of a few cells."""
    with tempfile.TemporaryDirectory() as name:
        path = Path(name) / "large.toml"
        path.write_text(SMALL.replace("SEED", str(seed)), encoding="utf-8")
        return tracer.run(tracer.load_run(path), workers=1)


def enlarged(ds: xr.Dataset) -> xr.Dataset:
    """Return the product with each cell repeated until there are SIZES of them; nothing is held."""
    stored = without_label_indexes(ds)
    repeats = {name: size // stored.sizes[name] for name, size in SIZES.items()}
    variables: dict[Hashable, xr.Variable] = {}
    for name, variable in stored.variables.items():
        times = [repeats.get(str(dim), 1) for dim in variable.dims]
        values = variable.values
        if name in repeats:
            # Coordinates must rise: between the old ones by even steps.
            size = SIZES[str(name)]
            values = np.interp(np.linspace(0, len(values) - 1, size), np.arange(len(values)), values)
            variables[name] = xr.Variable(variable.dims, values, variable.attrs)
        elif np.prod(times) == 1:
            variables[name] = xr.Variable(variable.dims, values, variable.attrs)
        else:
            shape = tuple(size * by for size, by in zip(values.shape, times, strict=True))
            variables[name] = lazy_variable(
                variable.dims, shape, values.dtype, _repeating(values, times), variable.attrs
            )
    coordinates = {name: variables.pop(name) for name in stored.coords}
    return with_label_indexes(xr.Dataset(variables, coordinates, ds.attrs))


def _repeating(values: NDArray[Any], times: list[int]) -> Any:
    def read(key: Key) -> NDArray[Any]:
        places = []
        for one, size, by in zip(key, values.shape, times, strict=True):
            numbers = np.arange(size * by)[one] // by
            places.append(np.atleast_1d(numbers))
        block = values[np.ix_(*places)]
        # A little of each cell's own, so that compression has work to do.
        ripple = np.sin(np.arange(block.size, dtype=np.float64)).reshape(block.shape)
        dropped = tuple(0 if isinstance(one, int) else slice(None) for one in key)
        return np.asarray((block * (1.0 + 1e-3 * ripple))[dropped], values.dtype)

    return read


def step(words: list[str]) -> None:
    """Do one of the steps in this process, whose peak memory is the answer."""
    what, *paths = words
    begin = time.perf_counter()
    if what == "write":
        ds = enlarged(small_product(int(paths[1])))
        print(f"{sum(v.size for v in ds.variables.values()) / 1e6:.0f} million values; ", end="")
        tracer.save_product(ds, paths[0])
    elif what == "merge":
        products = [(path, tracer.open_product(path)) for path in paths[1:]]
        tracer.save_product(merged_product(products), paths[0])
    else:
        with tracer.open_product(paths[0]) as ds:
            column = ds.number_density_replicates.isel(latitude=90, local_time=720).values
            print(f"one profile of {column.size} values; ", end="")
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e3
    print(f"{time.perf_counter() - begin:.1f} s, peak memory {peak:.0f} MB")


def main() -> int:
    """Run the steps in processes of their own and print what each took."""
    if len(sys.argv) > 1:
        step(sys.argv[1:])
        return 0
    with tempfile.TemporaryDirectory(dir=os.environ.get("TMPDIR")) as name:
        first, second, merged = (str(Path(name) / file) for file in ("a.nc", "b.nc", "ab.nc"))
        for words in (
            ["write", first, "1"],
            ["write", second, "2"],
            ["merge", merged, first, second],
            ["read", merged],
        ):
            print(f"{words[0]:6s}", end="", flush=True)
            subprocess.run([sys.executable, __file__, *words], check=True, cwd=ROOT)
        print(f"file   {Path(merged).stat().st_size / 1e6:.0f} MB on disk")
    return 0


if __name__ == "__main__":
    sys.exit(main())
