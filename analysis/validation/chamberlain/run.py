"""Density and columns of whole runs against Chamberlain's exosphere, to a few tenths of a per cent."""

import sys
from math import exp, pi, sqrt

import numpy as np
from scipy.integrate import quad
from scipy.special import gammainc

import tracer
from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.engine.runspec.load import parse_run

GM, RADIUS, RATE, HELIUM = 1e12, 1e6, 1e24, 4.002602 * ATOMIC_MASS
RUN = """
title = "thermal exosphere"
[body]
name = "Ball"
radius = "1000 km"
gm = "1000 km3 s-2"
[gas]
species = "He"
[[release]]
name = "thermal"
rate = "1e24 s-1"
speed = {{ law = "maxwell-flux", temperature = "{kelvin!r} K" }}
[surface]
sticking = 1.0
[domain]
outer_radius = "1e4 radii"
age_limit = "1000 yr"
[grid]
altitude = {{ first_cell = "{first} km", top = "{top} km", cells = 12 }}
latitude_cells = 1
local_time_cells = 1
[ensemble]
particles_per_batch = 100_000
batches = 100
replicates = 0
"""


def density(jeans: float, x: float) -> float:
    """Return n/n_c at r = x R, ballistic and escaping parts together (Chamberlain 1963)."""
    lam = jeans / x
    psi, s = lam * lam / (lam + jeans), sqrt(max(0.0, jeans * jeans - lam * lam)) / jeans
    whole, part = gammainc(1.5, lam), gammainc(1.5, lam - psi)
    ballistic = whole - s * exp(-psi) * part
    escaping = 0.5 * ((1.0 - whole) - s * exp(-psi) * (1.0 - part))
    return exp(lam - jeans) * (ballistic + escaping)


def integral(jeans: float, low: float, high: float, power: int) -> float:
    """Return the integral of n/n_c x^power dx between `low` and `high` radii."""

    def integrand(w: float) -> float:
        x = 1.0 + w * w
        return density(jeans, x) * x**power * 2.0 * w

    return quad(integrand, sqrt(low - 1.0), sqrt(high - 1.0), limit=200)[0]


def main() -> int:
    """Trace each case, print the table and return 0 where all hold."""
    fine = True
    for jeans, first, top in ((5.0, 50, 10_000), (10.0, 25, 2_000), (50.0, 5, 200)):
        kelvin = GM * HELIUM / (BOLTZMANN * RADIUS * jeans)
        product = tracer.run(parse_run(RUN.format(kelvin=kelvin, first=first, top=top), "run file"))
        base = RATE / (4.0 * pi * RADIUS**2) * sqrt(2.0 * pi * HELIUM / (BOLTZMANN * kelvin))
        edges = 1.0 + product.altitude_bounds.values / RADIUS
        expected = [integral(jeans, a, b, 2) / ((b**3 - a**3) / 3.0) * base for a, b in edges]
        found = list(product.number_density.values[0, :, 0, 0])
        error = list(product.number_density_standard_error.values[0, :, 0, 0])
        expected.append(integral(jeans, 1.0, edges[-1, 1], 0) * base * RADIUS)
        found.append(product.vertical_column.item())
        error.append(product.vertical_column_standard_error.item())
        off = np.divide(found, expected) - 1.0
        sigmas = np.subtract(found, expected) / error
        fine = fine and bool(np.all(np.abs(off) < 0.02) and np.all(np.abs(sigmas) < 4.0))
        print(
            f"lambda_c {jeans:g}: {'':12s} {'Chamberlain':>12s} {'run':>12s} {'deviation':>10s} {'errors':>7s}"
        )
        names = [f"n, {a:7.4f} to {b:7.4f} R" for a, b in edges] + ["column to the top"]
        for row in zip(names, expected, found, off, sigmas, strict=True):
            print("{:26s} {:12.5e} {:12.5e} {:10.2%} {:7.2f}".format(*row))
    print("holds" if fine else "FAILS")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
