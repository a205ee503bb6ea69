"""Crossing fractions of the outer radius from whole runs, to a standard error of half a per cent or better."""

import sys
from math import exp

from scipy.integrate import quad

import tracer
from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.engine.runspec.load import parse_run

GM, RADIUS, HELIUM = 1e12, 1e6, 4.002602 * ATOMIC_MASS
MOON_GM, MOON_RADIUS, MOON_HILL = 4902.800e9, 1737.4e3, 58_146e3

OWN = f'name = "Ball"\nradius = "{RADIUS} m"\ngm = "{GM} m3 s-2"'
RUN = """
title = "crossing fraction"
[body]
{body}
[gas]
species = "He"
[[release]]
name = "thermal"
rate = "1e24 s-1"
speed = {{ law = "maxwell-flux", temperature = "{kelvin!r} K" }}
[surface]
sticking = 1.0
[domain]
age_limit = "1e9 yr"
{outer}
[grid]
altitude = {{ first_cell = "100 km", top = "1 radii", cells = 1 }}
latitude_cells = 1
local_time_cells = 1
[ensemble]
particles_per_batch = {particles}
batches = 100
"""


def crossing_fraction(jeans: float, ratio: float) -> float:
    """Return the integral over u in [0, 1] of (1 + X) exp(-X), X = lambda (1 - K)/(1 - K^2 u), K = `ratio`."""

    def share(u: float) -> float:
        x = jeans * (1.0 - ratio) / (1.0 - ratio * ratio * u)
        return (1.0 + x) * exp(-x)

    return quad(share, 0.0, 1.0, epsabs=0.0, epsrel=1e-12)[0]


def main() -> int:
    """Trace each case, print the table and return 0 where all hold."""
    moon_jeans = MOON_GM * HELIUM / (BOLTZMANN * 392.0 * MOON_RADIUS)
    cases = [
        (
            "Moon He 392 K, Hill radius",
            'name = "Moon"',
            392.0,
            "",
            moon_jeans,
            MOON_RADIUS / MOON_HILL,
            50_000,
        )
    ]
    for jeans, radii, particles in (
        (10.0, 25.0, 600_000),
        (1.0, 1e6, 20_000),
        (3.0, 1e6, 50_000),
        (5.0, 1e6, 100_000),
    ):
        kelvin = GM * HELIUM / (BOLTZMANN * RADIUS * jeans)
        outer = f'outer_radius = "{radii} radii"'
        cases.append((f"lambda {jeans:g}, {radii:g} R", OWN, kelvin, outer, jeans, 1.0 / radii, particles))
    print(f"{'case':28s} {'integral':>12s} {'run':>12s} {'deviation':>10s} {'errors':>7s} {'Jeans':>12s}")
    fine = True
    for name, body, kelvin, outer, jeans, ratio, particles in cases:
        text = RUN.format(body=body, kelvin=kelvin, outer=outer, particles=particles)
        product = tracer.run(parse_run(text, "run file"))
        found = product.ledger.sel(fate="escaped").item() / 1e24
        error = product.ledger_standard_error.sel(fate="escaped").item() / 1e24
        expected = crossing_fraction(jeans, ratio)
        off, sigmas = found / expected - 1.0, (found - expected) / error
        fine = fine and abs(off) < 0.02 and abs(sigmas) < 4.0
        jeans_fraction = (1.0 + jeans) * exp(-jeans)
        print(f"{name:28s} {expected:12.6e} {found:12.6e} {off:10.2%} {sigmas:7.2f} {jeans_fraction:12.6e}")
    print("holds" if fine else "FAILS")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
