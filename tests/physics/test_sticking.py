"""Whole runs in which the ground's temperature decides who sticks."""

import numpy as np

RUN = """
title = "Sodium over Harrow, sticking by temperature"
body = { name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2" }
gas = { species = "Na" }
domain = { outer_radius = "20 radii" }
grid = { altitude = { cells = 2, top = "1 radii" }, latitude_cells = 2, local_time_cells = 4 }
ensemble = { particles_per_batch = 1500, batches = 10 }
[[release]]
name = "ground"
rate = "1e24 s-1"
speed = { law = "maxwell-flux", temperature = "surface" }
[surface]
temperature = { law = "quarter-power", subsolar = "700 K", night = "250 K" }
sticking = { law = "exponential", at = "250 K", value = 0.5, e_folding = "272.8 K" }
"""


def test_shares_of_landings_that_stick_are_those_of_the_grounds_temperature(traced):
    product = traced(RUN)
    area = product.cell_area
    captured = (product.capture_flux * area).sum("latitude").isel(release=0)
    landed = (product.return_flux * area).sum("latitude").isel(release=0)
    # Cells of local time 0-6 h and 18-24 h are night.
    night = captured[[0, 3]].sum() / landed[[0, 3]].sum()
    day = captured[[1, 2]].sum() / landed[[1, 2]].sum()
    weight = 1e24 / 15000
    night_error = np.sqrt(0.25 / (landed[[0, 3]].sum() / weight))
    # Binomial, no losses; false alarm 6e-5.
    assert abs(night - 0.5) < 4.0 * night_error
    # By day 0.096 (700 K) to 0.5; where landings are even over the ground, cosines of the solar zenith angle are.
    kelvin = 250.0 + 450.0 * ((np.arange(10_000) + 0.5) / 10_000) ** 0.25
    expected = np.mean(0.5 * np.exp((250.0 - kelvin) / 272.8))
    # Launches follow landings, which favour the hot ground's neighbours: only near the even share.
    assert abs(day - expected) < 0.02
    assert float(product.ledger.sel(fate="captured").sum()) > 0.99e24
