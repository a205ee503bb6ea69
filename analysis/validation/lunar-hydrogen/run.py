"""How long the Moon keeps molecular hydrogen, and where, against an independent Monte Carlo."""

import sys
from math import pi

import numpy as np
import xarray as xr

from tracer.constants import ATOMIC_MASS
from tracer.engine.runspec.load import parse_run
from tracer.engine.tracing import run
from tracer.kernels.endings import CROSSED
from tracer.kernels.hops import single_hops
from tracer.kernels.launching import velocities
from tracer.kernels.temperature import HURLEY_2015, SurfaceTemperature, temperatures
from tracer.kernels.world import Motion
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.tally.axes import direction

MASS = 2.01588
RATE = 2.2e-3 / (MASS * ATOMIC_MASS)
"""2.2 g/s in molecules per second."""
OUTER = 58_100e3
RUN = f"""
title = "Molecular hydrogen over the Moon"
body = {{ name = "Moon" }}
gas = {{ species = "H2", mass = "{MASS} u" }}
domain = {{ outer_radius = "{OUTER} m", age_limit = "10 yr" }}
grid = {{ altitude = {{ first_cell = "5 km", top = "8 radii", cells = 8 }} }}
ensemble = {{ particles_per_batch = 60_000, batches = 40, seed = 9 }}
[[release]]
name = "uniform"
rate = "{RATE} s-1"
speed = {{ law = "maxwell-flux", temperature = "surface" }}
[surface]
temperature = "hurley-2015"
"""
LIMIT = 0.05
LAUNCHES = 400_000


def last_flight(product: xr.Dataset) -> float:
    """Return the mean time [s] of the flights that reach the outer radius, launched where the run launched atoms."""
    latitudes, hours = product.latitude.values, product.local_time.values
    places = np.array([direction(latitude, hour) for latitude in latitudes for hour in hours])
    weight = ((product.release_flux + product.return_flux) * product.cell_area).transpose(
        "latitude", "local_time"
    )
    share = weight.values.ravel() / weight.values.sum()
    rng = np.random.default_rng(6)
    up = places[rng.choice(len(places), LAUNCHES, p=share)]
    kelvin = temperatures(SurfaceTemperature(HURLEY_2015, np.nan, np.nan), up)
    speed = MaxwellFlux(None).speeds(rng.random(LAUNCHES), kelvin, MASS * ATOMIC_MASS)
    motion = Motion(4902.8e9, 1737.4e3, OUTER, 0.0, np.inf, 0.0)
    ways = velocities(up, speed, np.sqrt(rng.random(LAUNCHES)), 2.0 * pi * rng.random(LAUNCHES))
    endings, times, _, _ = single_hops(motion, up, ways)
    return float(times[endings == CROSSED].mean())


def mean_and_error(product: xr.Dataset, where: xr.DataArray) -> tuple[float, float]:
    """Return the mean density [cm-3] of the lowest cells in a region, and its standard error from the replicates."""
    area = product.cell_area
    ground = (product.number_density.isel(altitude=0).where(where)).weighted(area).mean().item()
    each = (product.number_density_replicates.isel(altitude=0).where(where)).weighted(area)
    each = each.mean(("latitude", "local_time"))
    return 1e-6 * ground, 1e-6 * float(each.std(ddof=1)) / each.size**0.5


def main() -> int:
    """Compare, print the table and return 0 where all hold."""
    product = run(parse_run(RUN, "moon")).isel(release=0)
    hours = product.local_time
    low = abs(product.latitude) < 20.0
    life, hops = product.mean_life.item(), product.mean_flights.item()
    life_error, hops_error = (product[f"mean_{name}_standard_error"].item() for name in ("life", "flights"))
    figures = (
        ("mean life s", 1.004e5, life, life_error),
        ("life up to the last landing s", 5.68e4, life - last_flight(product), life_error),
        ("hops", 9.4, hops, hops_error),
        ("noon cm-3", 143.0, *mean_and_error(product, low & (abs(hours - 12.0) < 1.5))),
        ("midnight cm-3", 967.0, *mean_and_error(product, low & ((hours < 1.0) | (hours > 23.0)))),
        ("poleward of 75 deg cm-3", 694.0, *mean_and_error(product, abs(product.latitude) > 75.0)),
    )
    fine = True
    print(f"{'figure':32s} {'expected':>12s} {'traced':>12s} {'error':>8s}   off")
    for name, expected, found, error in figures:
        off = found / expected - 1.0
        fine = fine and abs(off) < LIMIT
        print(f"{name:32s} {expected:12.5g} {found:12.5g} {error:8.2g} {off:8.2%}")
    print("holds" if fine else "FAILS")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
