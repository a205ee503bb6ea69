"""Invented products for figures: any number of releases, any size of values, cells never hit or poorly known."""

import os
from collections.abc import Callable
from pathlib import Path
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

RADIUS = 1.8e6
VIEWS = {"tail_from_north": "north", "from_dawn": "dawn", "from_dusk": "dusk", "from_the_sun": "sun"}
CELLS = {"altitude": 4, "latitude": 4, "local_time": 6}
PIXELS = (7, 5)
BINS = 8


@pytest.fixture(scope="session")
def make_product() -> Callable[..., xr.Dataset]:
    """Return a function that makes a product whose fields all have one size, known to a tenth."""

    def make(
        releases: tuple[str, ...] = ("impact vapour",),
        size: float = 1e9,
        replicates: int = 3,
        lines: tuple[str, ...] = ("na_d2", "na_d1"),
        views: dict[str, Any] = VIEWS,
        radius: float = RADIUS,
        title: str = "Sodium over Harrow",
        top: float = 4.0,
        resolved: tuple[str, ...] = (),
    ) -> xr.Dataset:
        grid = make_grid(radius, 0.01 * radius, top * radius, *CELLS.values())
        planes = [
            make_image_plane(
                name,
                name.replace("_", " "),
                viewer_direction(place),
                (-4 * radius, 3 * radius),
                (-2 * radius, 2 * radius),
                PIXELS,
                (-4e3, 4e3, BINS) if name in resolved else None,
            )
            for name, place in views.items()
        ]
        sizes = {"release": len(releases), "fate": len(FATE_LABELS), "line": len(lines), **CELLS}
        for name in views:
            sizes |= {
                f"{name}_horizontal": PIXELS[0],
                f"{name}_vertical": PIXELS[1],
                f"{name}_velocity": BINS,
            }
        random = np.random.default_rng(20310601)
        fields = {}
        others = np.random.default_rng(7)
        for name, row in layout(views, bool(lines), resolved).items():
            shape = tuple(sizes[axis] for axis in row.dimensions)
            if row.ratio is not None:
                # Velocities stay such: from 1 to 3 km/s.
                mean = others.uniform(1e3, 3e3, shape)
                spread = mean * others.normal(1.0, 0.1, (replicates, *shape))
                fields[name] = FieldStatistics(mean, 0.1 * mean, spread if replicates else None)
            elif row.velocity:
                mean = size * others.uniform(0.5, 1.5, shape)
                spread = mean * others.normal(1.0, 0.1, (replicates, *shape))
                fields[name] = FieldStatistics(
                    mean, 0.1 * mean, spread.clip(max=3e38) if replicates else None
                )
            elif row.tallied:
                mean = size * random.uniform(0.5, 1.5, shape)
                kept = row.replicated and replicates > 0
                spread = mean * random.normal(1.0, 0.1, (replicates, *shape))
                # Replicates are in single precision, which ends at 3.4e38.
                fields[name] = FieldStatistics(mean, 0.1 * mean, spread.clip(max=3e38) if kept else None)
        known = global_attributes(title, "tracer run harrow.toml")
        return assemble(grid, planes, releases, fields, {}, {**known, "body_radius": radius}, lines)

    return make


@pytest.fixture
def empty() -> Callable[[xr.Dataset], xr.Dataset]:
    """Return a function that makes a product in which nothing was ever counted."""

    def emptied(product: xr.Dataset) -> xr.Dataset:
        nothing = product.copy(deep=True)
        for name in map(str, product.data_vars):
            if f"{name}_standard_error" in product:
                nothing[name].values[...] = 0.0
                nothing[f"{name}_standard_error"].values[...] = np.nan
            if name.endswith("_replicates"):
                nothing[name].values[...] = 0.0
        return nothing

    return emptied


PLAN_COLUMNS = (
    "time,tangent_altitude_km,sun_angle_deg,phase_angle_deg,brightness_na_d2_rayleigh,"
    "brightness_na_d2_standard_error_rayleigh,snr,snr_standard_error,sun_keep_out,saturated,do_not_command,command"
)


@pytest.fixture
def make_plan(tmp_path) -> Callable[..., Path]:
    """Return a function that writes what `tracer plan` writes as CSV: rows a minute apart, some in the keep-out."""

    def make(rows: int = 6, forbidden: tuple[int, ...] = (4, 5), brightness: float = 2e5) -> Path:
        lines = [PLAN_COLUMNS]
        for row in range(rows):
            inside = row in forbidden
            command = "NOT to be commanded: Sun inside its keep-out" if inside else "only after flight rules"
            lines.append(
                f"2031-06-01T00:{row:02d}:00,{20 + 10 * row},{50 - 5 * row},{40 + row},{brightness * (row + 1)!r},"
                f"{0.1 * brightness!r},{30 + row},1.5,{inside},{row == 0},{inside},{command}"
            )
        path = tmp_path / "plan.csv"
        path.write_text("\n".join(lines) + "\n", encoding="utf-8")
        return path

    return make


@pytest.fixture
def update_looks() -> bool:
    """Return whether the stored looks of figures are to be written anew: with UPDATE_LOOKS=1 in the environment."""
    return os.environ.get("UPDATE_LOOKS") == "1"
