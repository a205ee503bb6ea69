"""E-folding length of tangent columns over Mercury: sodium at 1,200 K, gravity alone, against Chamberlain's gas.

What is published as a scale height of 117 km (Cassidy et al. 2015, Icarus 248, 547) is kT/(m g) at the ground. Tangent
columns fall more slowly: gravity lessens with altitude, and the line of sight lengthens.
"""

from math import sqrt

import numpy as np
import pytest
from scipy.integrate import quad

from tracer.catalogue.load import bodies, gases
from tracer.constants import BOLTZMANN
from tracer.observe.gas import gas_of
from tracer.observe.integration import integrals_along
from tracer.observe.ray_table import sights_of
from tracer.observe.sightlines import as_table
from tracer.physics.chamberlain import density_ratio

BODY, MASS, KELVIN = bodies()["Mercury"], gases()["Na"].mass, 1200.0
ALTITUDES = np.linspace(58.5e3, 351e3, 12)
"""Half to three times 117 km [m]."""
TOP = 1.5e6
RUN = """
title = "sodium over Mercury"
[body]
name = "Mercury"
[gas]
species = "Na"
[[release]]
name = "thermal"
rate = "1e24 s-1"
speed = { law = "maxwell-flux", temperature = "1200 K" }
[surface]
sticking = 1.0
[domain]
outer_radius = "300 radii"
[grid]
altitude = { first_cell = "10 km", top = "1500 km", cells = 60 }
latitude_cells = 1
local_time_cells = 1
[ensemble]
particles_per_batch = 6_000
batches = 20
replicates = 20
seed = 20310601
"""


def folding_length(columns) -> float:
    """Return minus one over the slope of the straight line through ln(column) against tangent altitude [m]."""
    return -1.0 / np.polyfit(ALTITUDES, np.log(columns), 1)[0]


def chamberlain_length(kelvin: float) -> float:
    """Return the e-folding length [m] of the tangent columns of Chamberlain's gas up to the grid's top."""
    jeans = BODY.gm * MASS / (BOLTZMANN * kelvin * BODY.radius)
    columns = []
    for altitude in ALTITUDES:
        b, far = 1.0 + altitude / BODY.radius, 1.0 + TOP / BODY.radius
        columns.append(
            quad(
                lambda w, b=b: density_ratio(jeans, sqrt(b * b + w**4)) * 2.0 * w,
                0.0,
                (far**2 - b**2) ** 0.25,
            )[0]
        )
    return folding_length(columns)


@pytest.fixture(scope="module")
def found(traced) -> tuple[float, float]:
    """Return the e-folding length in the run and its standard error from the replicates [m]."""
    gas = gas_of(traced(RUN), None, True)
    count = len(ALTITUDES)
    rays = as_table(
        {
            "observer_x_km": np.full(count, 3e4),
            "observer_y_km": np.full(count, 1e4),
            "observer_z_km": np.zeros(count),
            "tangent_altitude_km": ALTITUDES / 1e3,
            "tangent_latitude_deg": np.full(count, 20.0),
            "tangent_local_time_h": np.full(count, 10.0),
        }
    )
    integrals = integrals_along(gas, sights_of(rays, gas.radius))
    each = [folding_length(one) for one in integrals.column_replicates[:, 0].T]
    return folding_length(integrals.column[:, 0]), float(np.std(each, ddof=1) / sqrt(len(each)))


def test_published_scale_height_is_that_at_the_ground():
    # Cassidy et al. 2015: 1,200 K and 117 km.
    gravity = BODY.gm / BODY.radius**2
    assert BOLTZMANN * KELVIN / (MASS * gravity) == pytest.approx(117e3, rel=5e-3)


def test_tangent_columns_fold_as_chamberlains(found):
    length, error = found
    # Student's t with 19 degrees of freedom beyond 4: 8e-4 two-sided.
    assert abs(length - chamberlain_length(KELVIN)) < 4.0 * error
    assert error < 5e-3 * length


def test_tangent_columns_fold_more_slowly_than_the_scale_height_at_the_ground(found):
    length, error = found
    assert (length - 117e3) / error > 20.0
    # d ln N/dh = -R^2/(H r^2) + 3/(2 r) for N ~ n sqrt(2 pi r H r^2/R^2), barometric n, in the middle of the range.
    r = BODY.radius + ALTITUDES.mean()
    barometric = 1.0 / (BODY.radius**2 / (117e3 * r * r) - 1.5 / r)
    assert length == pytest.approx(barometric, rel=0.03)


def test_another_temperature_is_told_apart(found):
    length, error = found
    assert abs(length - chamberlain_length(0.95 * KELVIN)) > 6.0 * error
