"""Ranges and times of four million thermal hops a case against quadrature over orbits."""

import sys
from math import exp, pi, sqrt

import numpy as np
from scipy.special import gammainc, gammaincinv

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.kernels.arc_flight import CROSSED, LANDED
from tracer.kernels.hops import single_hops
from tracer.kernels.launching import velocities
from tracer.kernels.world import Motion
from tracer.physics.release.direction.cosine import Cosine
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux

BATCHES, LAUNCHES, NODES = 200, 20_000, 3_000
MOON, MERCURY = (4902.800e9, 1737.4e3, 58_146e3), (22031.868e9, 2439.4e3, 175_297e3)
CASES = {
    "Moon He 250 K": (*MOON, 4.002602, 250.0),
    "Moon H2O 250 K": (*MOON, 18.015, 250.0),
    "Moon Ar 100 K": (*MOON, 39.9623831, 100.0),
    "Mercury Na 1200 K": (*MERCURY, 22.98976928, 1200.0),
    "Mercury Na 3000 K": (*MERCURY, 22.98976928, 3000.0),
}
FIGURES = ("mean arc km", "median arc km", "rms arc km", "mean time s", "median time s", "crossing")


def batch(case: tuple[float, ...], seed: int) -> np.ndarray:
    """Return the six figures of one batch of launches through the kernels."""
    gm, radius, hill, mass, kelvin = case
    u = np.random.default_rng(seed).random((LAUNCHES, 3))
    speed = MaxwellFlux(kelvin).speeds(u[:, 0], np.zeros(1), mass * ATOMIC_MASS)
    cosine = Cosine(1.0).zenith_cosines(u[:, 1])
    up = np.tile([0.36, 0.48, -0.8], (LAUNCHES, 1))
    motion = Motion(gm, radius, 1e9 * radius, 0.0, np.inf, 0.0)
    ending, time, arc, apex = single_hops(motion, up, velocities(up, speed, cosine, 2.0 * pi * u[:, 2]))
    landed = ending == LANDED
    km, time, inside = arc[landed] * radius / 1e3, time[landed], apex[landed] + radius < hill
    spread = km.mean(), np.median(km), sqrt((km**2).mean())
    return np.array([*spread, time[inside].mean(), np.median(time), np.mean(ending == CROSSED)])


def quadrature(case: tuple[float, ...]) -> np.ndarray:
    """Return the figures by the midpoint rule over energy and zenith angle of the bound launches."""
    gm, radius, hill, mass, kelvin = case
    jeans = gm * mass * ATOMIC_MASS / (BOLTZMANN * kelvin * radius)
    t = (np.arange(NODES) + 0.5) / NODES
    quantile, share = 1.0 - (1.0 - t) ** 6, 6.0 * (1.0 - t) ** 5
    energy = gammaincinv(2.0, quantile * gammainc(2.0, jeans))
    x = np.minimum(2.0 * energy / jeans, 2.0 * (1.0 - 1e-15))[:, None]  # v^2 R/GM
    sine2 = t[None, :]
    km = 2.0 * np.arctan2(x * np.sqrt(sine2 * (1.0 - sine2)), 1.0 - x * sine2) * radius / 1e3
    a = radius / (2.0 - x)
    e_sine = np.sqrt(x * (1.0 - sine2) * radius / a)
    time = 2.0 * np.sqrt(a**3 / gm) * (pi - np.arctan2(e_sine, 1.0 - radius / a) + e_sine)
    inside = a * (1.0 + np.sqrt(np.maximum(0.0, 1.0 - x * sine2 * (2.0 - x)))) < hill
    weight = np.broadcast_to(share[:, None] / share.sum() / NODES, km.shape)
    ranges = (weight * km).sum(), median(km, weight), sqrt((weight * km**2).sum())
    mean_time = (weight * time)[inside].sum() / weight[inside].sum()
    return np.array([*ranges, mean_time, median(time, weight), (1.0 + jeans) * exp(-jeans)])


def median(values: np.ndarray, weights: np.ndarray) -> float:
    """Return the weighted median."""
    order = np.argsort(values, axis=None)
    reached = np.cumsum(weights.ravel()[order])
    return values.ravel()[order][np.searchsorted(reached, 0.5)]


def main() -> int:
    """Compare, print the table and return 0 where all hold."""
    fine = True
    print(
        f"{'case':18s} {'figure':14s} {'quadrature':>12s} {'kernels':>12s} {'deviation':>10s} {'errors':>7s}"
    )
    for name, case in CASES.items():
        expected = quadrature(case)
        batches = np.array([batch(case, seed) for seed in range(BATCHES)])
        found, error = batches.mean(axis=0), batches.std(axis=0, ddof=1) / sqrt(BATCHES)
        for row in zip(FIGURES, expected, found, error, strict=True):
            figure, known, value, sigma = row
            if known * BATCHES * LAUNCHES < 10.0:
                fine = fine and value <= 10.0 / (BATCHES * LAUNCHES)
                continue
            off, sigmas = value / known - 1.0, (value - known) / sigma
            fine = fine and abs(off) < 0.02 and abs(sigmas) < 4.0
            print(f"{name:18s} {figure:14s} {known:12.6g} {value:12.6g} {off:10.3%} {sigmas:7.2f}")
    print("holds" if fine else "FAILS")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
