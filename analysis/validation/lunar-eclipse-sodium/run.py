"""How sodium's brightness falls with the distance from the full Moon, seen from the Sun's side."""

import sys
from itertools import pairwise
from math import sqrt
from pathlib import Path

import numpy as np

import tracer

FOLDER = Path(__file__).parent
PUBLISHED = -1.4
"""Power of the distance, to 12 lunar radii: Mendillo et al. 1999, Icarus 137, 13."""
EDGES = np.geomspace(1.5, 12.0, 10)
"""Of rings about the Moon's middle [radii]."""
RANGES = ((1.5, 12.0), (3.0, 12.0))
"""Distances over which a power law is fitted [radii]; the first is that of the verdict."""
OUTER_RADII = ("200 radii", "33.5 radii", "1000 radii")
"""To which atoms are followed: most of the Earth's distance, the Hill radius, and far down the tail; the first for the
verdict."""
SOURCE = "photon desorption"
"""The source of the verdict, the usual one of lunar sodium; the others stand beside it."""
CLOSE = 0.15
"""Deviation of the power that counts as agreement."""


def rings(ds, release):
    """Return distances (N,) [radii], brightness of both D lines (N,) [R], and its replicates (G, N)."""
    x, y = (ds[f"sky_{axis}"].values / ds.attrs["body_radius"] for axis in ("horizontal", "vertical"))
    distance = np.hypot(x[np.newaxis, :], y[:, np.newaxis])
    light, groups = (
        ds[f"brightness_sky{ending}"].sel(release=release).astype(np.float64).sum(("line", "release")).values
        for ending in ("", "_replicates")
    )
    inside = [(distance >= low) & (distance < high) for low, high in pairwise(EDGES)]
    return (
        np.array([np.exp(np.log(distance[ring]).mean()) for ring in inside]),
        np.array([light[ring].mean() for ring in inside]),
        np.array([groups[:, ring].mean(axis=1) for ring in inside]).T,
    )


def power(distance, light) -> float:
    """Return the slope of the straight line through ln(light) against ln(distance)."""
    return float(np.polyfit(np.log(distance), np.log(light), 1)[0])


def power_with_error(distance, light, groups):
    """Return the power and its standard error, each replicate left out in turn."""
    count = len(groups)
    each = np.array([power(distance, one) for one in (groups.sum(axis=0) - groups) / (count - 1)])
    return power(distance, light), sqrt((count - 1) / count * float(((each - each.mean()) ** 2).sum()))


def print_rings(ds, name) -> dict[tuple[float, float], float]:
    """Print brightness and powers of one release, and return the power over each of `RANGES`."""
    distance, light, groups = rings(ds, [name])
    error = groups.std(axis=0, ddof=1) / sqrt(len(groups))
    for one in zip(distance, light, error, strict=True):
        print("  {:6.2f} R_M  {:10.4g} +- {:.2g} R".format(*one))
    powers = {}
    for low, high in RANGES:
        chosen = (distance > low) & (distance < high)
        powers[low, high], spread = power_with_error(distance[chosen], light[chosen], groups[:, chosen])
        print(f"  power from {low} to {high} R_M: {powers[low, high]:.3f} +- {spread:.3f}")
    return powers


def main() -> int:
    """Print the powers of each source, and return 0 where that of `SOURCE` is the one published."""
    found = {}
    for outer in OUTER_RADII:
        ds = tracer.run(tracer.load_run(FOLDER / "full-moon.toml", [f'domain.outer_radius="{outer}"']))
        for name in map(str, ds.release_name.values):
            print(f"{name}, 1e22 atoms a second, followed to {outer}")
            found[outer, name] = print_rings(ds, name)
    holds = abs(found[OUTER_RADII[0], SOURCE][RANGES[0]] - PUBLISHED) < CLOSE
    print(f"{SOURCE}: {'holds' if holds else 'FAILS'}")
    return 0 if holds else 1


if __name__ == "__main__":
    sys.exit(main())
