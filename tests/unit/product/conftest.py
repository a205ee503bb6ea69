"""A small invented product: two releases, one image, three replicates."""

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
import xarray as xr

from tracer.fate import FATE_LABELS
from tracer.product.assembling import assemble
from tracer.product.layout import layout
from tracer.product.provenance import global_attributes
from tracer.tally.axes import make_grid, make_image_plane, viewer_direction
from tracer.tally.field import FieldStatistics

RELEASES = ("photon desorption", "Verdampfung é")
SIZES = {
    "release": len(RELEASES),
    "fate": len(FATE_LABELS),
    "altitude": 4,
    "latitude": 3,
    "local_time": 5,
    "tail_from_north_vertical": 2,
    "tail_from_north_horizontal": 6,
    "tail_from_north_velocity": 3,
}


@pytest.fixture
def grid():
    return make_grid(1.8e6, 1e4, 1.8e7, SIZES["altitude"], SIZES["latitude"], SIZES["local_time"])


@pytest.fixture
def planes():
    north = viewer_direction("north")
    ends = ((-9e6, 3e6), (-2e6, 2e6), (6, 2), (-3e3, 3e3, SIZES["tail_from_north_velocity"]))
    return [make_image_plane("tail_from_north", "Tail from north", north, *ends)]


@pytest.fixture
def fields() -> dict[str, FieldStatistics]:
    random = np.random.default_rng(20310601)
    made = {}
    for name, row in layout(["tail_from_north"], velocities=["tail_from_north"]).items():
        shape = tuple(SIZES[axis] for axis in row.dimensions)
        mean, error = random.random(shape), random.random(shape)
        mean.flat[0], error.flat[0] = 0.0, np.nan
        if row.tallied:
            made[name] = FieldStatistics(mean, error, random.random((3, *shape)) if row.replicated else None)
    return made


@pytest.fixture
def make_product(grid, planes, fields) -> Callable[..., xr.Dataset]:
    def make(**attributes: Any) -> xr.Dataset:
        known = global_attributes("Sodium over Harrow", "tracer run harrow.toml")
        plain = {"surface_temperature": np.full((SIZES["latitude"], SIZES["local_time"]), 300.0)}
        extra = {"run_file": 'title = "Sodium over Harrow"\n', "seed": 20310601, "body_radius": 1.8e6}
        return assemble(grid, planes, RELEASES, fields, plain, {**known, **extra, **attributes})

    return make


@pytest.fixture
def product(make_product) -> xr.Dataset:
    return make_product()
