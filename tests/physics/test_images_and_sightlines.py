"""Images and lines of sight through cells are two estimates of one column: they agree within their errors."""

import math

import numpy as np
import pytest

from tracer.observe.gas import gas_of
from tracer.observe.integration import integrals_along
from tracer.observe.sights import Sights
from tracer.observe.spread import standard_error

RUN = """
title = "One gas, two estimates"
[body]
name = "Harrow"
radius = "1800 km"
gm = "9500 km3 s-2"
[sun]
distance = "0.35 au"
[gas]
species = "Na"
[[release]]
name = "vapour"
rate = "2e24 s-1"
speed = { law = "maxwell-flux", temperature = "3500 K" }
place = { law = "cosine-power", toward = "sun", power = 1 }
[surface]
sticking = 1.0
[domain]
outer_radius = "4 radii"
[grid]
altitude = { first_cell = "30 km", top = "3 radii", cells = 40 }
latitude_cells = 24
local_time_cells = 36
[[image]]
name = "north"
look_from = "north"
horizontal = ["-3 radii", "3 radii"]
vertical = ["-3 radii", "3 radii"]
pixels = [12, 12]
[[image]]
name = "morning"
look_from = { latitude = "20 deg", local_time = 9.0 }
horizontal = ["-3 radii", "3 radii"]
vertical = ["-3 radii", "3 radii"]
pixels = [12, 12]
[ensemble]
particles_per_batch = 400
batches = 40
replicates = 40
"""
RAYS_A_SIDE = 24
"""Rays through each pixel, along and across: at the limb half of a pixel is hidden, at its edge the gas is densest."""


@pytest.mark.parametrize("image", ["north", "morning"])
def test_image_and_sight_lines_averaged_over_its_pixels_agree(traced, image):
    ds = traced(RUN)
    gas = gas_of(ds, ["na_d2"])
    column = ds[f"column_{image}"]
    toward, up, right = (np.array(column.attrs[name]) for name in ("toward_viewer", "up", "right"))
    shares = (np.arange(RAYS_A_SIDE) + 0.5) / RAYS_A_SIDE
    bounds = [ds[f"{image}_{axis}_bounds"].values for axis in ("vertical", "horizontal")]
    places = [(low + (high - low) * shares).ravel() for low, high in (np.split(b, 2, axis=1) for b in bounds)]
    vertical, horizontal = np.meshgrid(*places, indexing="ij")
    start = (
        vertical.ravel()[:, None] * up
        + horizontal.ravel()[:, None] * right
        + 10.0 * gas.traced_radius * toward
    )
    found = integrals_along(gas, Sights(start, np.broadcast_to(-toward, start.shape)))
    sides = (12, RAYS_A_SIDE, 12, RAYS_A_SIDE)
    for name, replicates, seen in (
        (f"column_{image}", found.column_replicates[:, 0], found.column[:, 0]),
        (f"brightness_{image}", found.photon_replicates[:, 0, 0] / 1e10, found.photons[:, 0, 0] / 1e10),
    ):
        pixels = ds[name].isel(release=0)
        groups = ds[f"{name}_replicates"].isel(release=0)
        if "line" in pixels.dims:
            pixels, groups = pixels.sel(line="na_d2"), groups.sel(line="na_d2")
        by_ray = replicates.reshape(*sides, -1).mean(axis=(1, 3))
        difference = pixels.values - seen.reshape(sides).mean(axis=(1, 3))
        error = standard_error(np.moveaxis(groups.values, 0, -1) - by_ray, np.ones(40))
        known = pixels.values > 0.0
        # Student's t of 39: of 288 pixels one is beyond 4 standard errors by chance in 8 % of seeds, a second one in
        # 0.3 %, and one beyond 5 in 0.4 %.
        deviations = difference[known] / error[known]
        assert np.count_nonzero(np.abs(deviations) >= 4.0) <= 1
        assert np.all(np.abs(deviations) < 5.0)
        # Its mean square is 39/37; pixels beside each other count the same atoms and scatter together.
        assert np.sqrt(np.mean(deviations**2)) == pytest.approx(math.sqrt(39.0 / 37.0), abs=0.35)
        # Both count the same atoms, so that they differ by less than either is known.
        own = standard_error(np.moveaxis(groups.values, 0, -1), np.ones(40))
        assert np.median(error[known] / own[known]) < 1.0
        total = difference[known].sum() / pixels.values[known].sum()
        assert abs(total) < 2e-3
