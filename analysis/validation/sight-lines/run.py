"""Tangent columns through cells against quadrature: on thin cells, and on the default grid."""

import sys
from collections.abc import Callable
from itertools import pairwise
from math import exp, gamma, pi, sqrt

import numpy as np
from scipy.integrate import quad
from scipy.special import gammainc

from tracer.kernels.rays import Contents, SphericalCells, Sums, integrate
from tracer.observe.reconstruction import reconstruct
from tracer.observe.sights import Sights, paths_of
from tracer.physics.sunlight import shadow_of

RADIUS = 1.8e6
ALLOWED = 5e-3
SCALES = (0.0, 0.02, 0.1, 0.3, 1.0, 2.0, 4.0)
"""Tangent altitudes in scale heights."""


def exponential(height: float) -> Callable[[float], float]:
    """Return exp(-altitude / height)."""
    return lambda r: exp((RADIUS - r) / height)


def chamberlain(jeans: float) -> Callable[[float], float]:
    """Return n/n_c above a uniform thermal source, both parts (Chamberlain 1963, Planet. Space Sci. 11, 901)."""
    G = gamma(1.5)

    def density(r: float) -> float:
        lam = jeans * RADIUS / r
        psi, s = lam * lam / (lam + jeans), sqrt(max(0.0, jeans * jeans - lam * lam)) / jeans
        inner, outer = gammainc(1.5, lam), gammainc(1.5, lam - psi)
        ballistic = 2.0 / sqrt(pi) * G * (inner - s * exp(-psi) * outer)
        escaping = G / sqrt(pi) * (1.0 - inner - s * exp(-psi) * (1.0 - outer))
        return exp(lam - jeans) * (ballistic + escaping)

    return density


def shell_means(density: Callable[[float], float], radii: np.ndarray) -> np.ndarray:
    """Return means over the shells' volumes."""
    contents = [
        quad(lambda r: density(r) * r * r, low, high, epsabs=0.0, epsrel=1e-11, limit=200)[0]
        for low, high in pairwise(radii)
    ]
    return np.array(contents) / (np.diff(radii**3) / 3.0)


def exact(density: Callable[[float], float], altitude: float, top: float) -> float:
    """Return the tangent column between the grid's tops."""
    rho = RADIUS + altitude
    reach = sqrt((top - rho) * (top + rho))
    points = np.geomspace(1e-4, 0.999, 16) * reach
    return (
        2.0
        * quad(
            lambda t: density(sqrt(rho * rho + t * t)), 0.0, reach, points=points, limit=400, epsrel=1e-10
        )[0]
    )


def columns(means: np.ndarray, radii: np.ndarray, altitudes: np.ndarray, flat: bool) -> np.ndarray:
    """Return tangent columns through the shells, each in four cells; `flat` for constant cells."""
    norms, decays = reconstruct(means, radii)
    if flat:
        norms, decays = np.ones_like(means), np.zeros_like(means)
    cells = SphericalCells(
        radii, np.array([-1.0, 0.0, 1.0]), np.array([]), True, np.array([-1.0, 1.0]), np.array([0.0, 0.0])
    )
    stored = [np.repeat(array, 4)[:, None] for array in (means, norms, decays)]
    contents = Contents(1, stored[0], stored[1], stored[2], np.empty((4 * len(means), 1, 0), np.float32))
    count = len(altitudes)
    start = np.stack([np.full(count, -1e8), np.zeros(count), RADIUS + altitudes], axis=1)
    paths, _ = paths_of(Sights(start, np.broadcast_to([1.0, 0.0, 0.0], (count, 3))), RADIUS)
    sums = Sums(np.zeros((count, 1)), np.zeros((count, 1)), np.zeros((count, 1, 0)), np.zeros(count))
    integrate(cells, shadow_of("none", RADIUS, 1.0), contents, paths, sums)
    return sums.all[:, 0]


def main() -> int:
    """Print the largest deviations and return 0 where the thin cells keep what they must."""
    default = np.concatenate(([0.0], np.geomspace(1e4, 10.0 * RADIUS, 50)))
    cases = [(f"exponential, H = {h / 1e3:.0f} km", exponential(h), h) for h in (3e4, 6e4, 1.5e5, 3e5)]
    cases += [
        (f"Chamberlain, lambda = {jeans:g}", chamberlain(jeans), RADIUS / jeans)
        for jeans in (5.0, 12.0, 30.0)
    ]
    print(f"{'':32s} {'H/20':>10s} {'default':>10s} {'constant':>10s}   default grid at {SCALES} H")
    good = True
    for name, density, height in cases:
        altitudes = height * np.array(SCALES)
        shown = []
        for edges, flat in ((np.linspace(0.0, 12.0 * height, 241), False), (default, False), (default, True)):
            radii = RADIUS + edges
            means = shell_means(density, radii)
            true = np.array([exact(density, altitude, radii[-1]) for altitude in altitudes])
            shown.append(columns(means, radii, altitudes, flat) / true - 1.0)
        good = good and np.abs(shown[0]).max() <= ALLOWED
        largest = " ".join(f"{100.0 * np.abs(values).max():9.4f}%" for values in shown)
        print(f"{name:32s} {largest}   {' '.join(f'{100.0 * value:+.3f}%' for value in shown[1])}")
    print("holds" if good else "FAILS")
    return 0 if good else 1


if __name__ == "__main__":
    sys.exit(main())
