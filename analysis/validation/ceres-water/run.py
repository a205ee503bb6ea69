"""What share of the water of Ceres ends in cold traps that catch 0.13 % of its landings."""

import sys
from math import exp

from scipy.integrate import quad

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.engine.runspec.load import parse_run
from tracer.engine.tracing import run

GM, RADIUS, MASS, OUTER = 62.628e9, 469.7e3, 18.015 * ATOMIC_MASS, 400.0
CHANCE = 0.0013
CASES = ((150.0, 0.001746), (165.0, 0.001420), (200.0, 0.000954))
RUN = """
title = "Water over Ceres that does not turn"
body = {{ name = "Ceres at rest", radius = "469.7 km", gm = "62.628 km3 s-2" }}
gas = {{ species = "H2O" }}
domain = {{ outer_radius = "{outer} radii", age_limit = "100 yr" }}
grid = {{ altitude = {{ first_cell = "50 km", top = "2 radii", cells = 3 }}, latitude_cells = 4, local_time_cells = 4 }}
ensemble = {{ particles_per_batch = 100_000, batches = 40, seed = 13 }}
[[release]]
name = "sublimation"
rate = "1e26 s-1"
speed = {{ law = "maxwell-flux", temperature = "surface" }}
[surface]
temperature = {{ law = "uniform", value = "{kelvin} K" }}
sticking = {chance}
"""


def crossing_fraction(jeans: float, outer: float) -> float:
    """Return the share of thermal launches that crosses `outer` radii: own quadrature over the launch angle."""
    k = 1.0 / outer

    def share(u: float) -> float:
        x = jeans * (1.0 - k) / (1.0 - k * k * u)
        return (1.0 + x) * exp(-x)

    return float(quad(share, 0.0, 1.0)[0])


def main() -> int:
    """Compare, print the table and return 0 where all hold."""
    fine = True
    print("ground   published law    geometric sum   traced               errors")
    for kelvin, expected in CASES:
        escapes = crossing_fraction(GM * MASS / (BOLTZMANN * kelvin * RADIUS), OUTER)
        # A landing is followed by capture or by another launch, alike everywhere: a geometric series.
        sure = CHANCE * (1.0 - escapes) / (1.0 - (1.0 - CHANCE) * (1.0 - escapes))
        product = run(parse_run(RUN.format(kelvin=kelvin, chance=CHANCE, outer=OUTER), "ceres")).isel(
            release=0
        )
        found = product.ledger.sel(fate="captured").item() / 1e26
        error = product.ledger_standard_error.sel(fate="captured").item() / 1e26
        sigmas = max(abs(found - expected), abs(found - sure)) / error
        fine = fine and sigmas < 4.0 and abs(sure / expected - 1.0) < 0.01
        print(
            f"{kelvin:.0f} K {100 * expected:12.4f} % {100 * sure:14.4f} % {100 * found:9.4f} % +- {100 * error:.4f} "
            f"{sigmas:8.2f}",
            flush=True,
        )
    print("holds" if fine else "FAILS")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
