"""Laws evaluated from the bins' means of responses that are known in closed form, against own quadrature."""

from collections.abc import Callable, Iterator

import numpy as np
from numpy.typing import NDArray

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.observe.responses import law_doubt, law_weights
from tracer.observe.within_bins import bias_bound
from tracer.physics.release.speed.sigmund_thompson import SigmundThompson
from tracer.physics.release.speed_bins import speed_bin_edges
from tracer.units import parse, si

Floats = NDArray[np.float64]

SODIUM = 22.98977 * ATOMIC_MASS
ESCAPE = 3249.0
EDGES = speed_bin_edges(32, ESCAPE, 1206.0, 3000.0)
"""Those of a run of sodium at 1,200 K over Harrow."""

KELVIN = (150.0, 300.0, 450.0, 600.0, 850.0, 1200.0, 1700.0, 2400.0, 3400.0, 4800.0)
BINDING = (0.3, 1.0, 2.0, 5.0)
CUTOFF = 500.0
"""Sputtered atoms [eV]."""

NODES = 400
ROUNDING = 1e-6
"""Part of a value down to which a law's moments are exact."""
SEED = 11
THRESHOLDS = 300
"""Speeds from 300 m/s to 6 km/s at which responses set in, twelve and more in most bins."""


def places() -> tuple[Floats, Floats]:
    """Return speeds (bins, NODES) and their weights, over which everything here is integrated."""
    nodes, weights = np.polynomial.legendre.leggauss(NODES)
    half = 0.5 * np.diff(EDGES)[:, np.newaxis]
    return EDGES[:-1, np.newaxis] + half * (1.0 + nodes), half * weights


def laws() -> Iterator[tuple[str, object, Callable[[Floats], Floats]]]:
    """Yield names, laws as they are evaluated, and their densities."""
    for kelvin in KELVIN:
        a = SODIUM / (2.0 * BOLTZMANN * kelvin)
        yield (
            f"{kelvin:.0f} K",
            {"law": "maxwell-flux", "temperature": kelvin},
            lambda v, a=a: 2.0 * a * a * v**3 * np.exp(-a * v * v),
        )
    for binding in BINDING:
        law = SigmundThompson(*(si(parse(f"{e:g} eV", "energy")) for e in (binding, CUTOFF)))
        yield f"sputtered {binding:g} eV", law, lambda v, law=law: law.density(v, SODIUM)


def responses(v: Floats) -> Iterator[tuple[str, Floats]]:
    """Yield families and responses (bins, NODES), with thresholds, peaks and jumps anywhere in the bins."""
    rng = np.random.default_rng(SEED)
    for power in (0.0, 0.5, 1.0, 2.0, 3.0):
        for start in np.linspace(300.0, 6000.0, THRESHOLDS):
            above = v > start
            rise = np.where(above, v - start, 1.0) ** power
            yield f"(v - v0)^{power:g} above v0", np.where(above, rise * np.exp(-v / 6000.0), 0.0)
    for start, width in zip(rng.uniform(300.0, 6000.0, 60), 10.0 ** rng.uniform(1.5, 3.5, 60), strict=True):
        yield "Gaussian peak", np.exp(-(((v - start) / width) ** 2))
        yield "box", np.where(np.abs(v - start) < width, 1.0, 0.0)
    for start, width in zip(rng.uniform(300.0, 3000.0, 60), 10.0 ** rng.uniform(1.0, 2.7, 60), strict=True):
        # Time of a ballistic flight between two heights: a root at the lower, a cusp at the upper.
        roots = [np.sqrt(np.maximum(v - begin, 0.0)) for begin in (start, start + width)]
        yield "time in a shell", roots[0] - roots[1]
    for start, width in zip(rng.uniform(300.0, 3000.0, 60), rng.uniform(100.0, 600.0, 60), strict=True):
        yield "smooth", np.log1p(np.exp((v - start) / width)) * np.exp(-v / 6000.0)
        yield "smooth", 1.0 / (1.0 + np.exp(-(v - start) / width))
    for power in (0.5, 1.0, 1.5):
        bound = 1.0 / (np.maximum(1.0 - (v / ESCAPE) ** 2, 0.0) + 0.05) ** power
        yield "long flights to escape", np.where(v < ESCAPE, bound, 0.1 * ESCAPE / v)


def table() -> dict[str, Floats]:
    """Return for each family (cases, 4): excess, that of two straight lines, bound, and value."""
    v, weights = places()
    half = 0.5 * np.diff(EDGES)[:, np.newaxis]
    x = (v - EDGES[:-1, np.newaxis]) / half - 1.0
    families, shapes = zip(*responses(v), strict=True)
    means = np.array([[0.5 * np.sum(c * w / half, axis=1) for w in (weights, weights * x)] for c in shapes])
    known = np.moveaxis(means, 0, -1).transpose(1, 0, 2)
    found: dict[str, list[Floats]] = {}
    for _, law, density in laws():
        exact = np.array([np.sum(density(v) * c * weights) for c in shapes])
        told = np.tensordot(law_weights(law, EDGES, SODIUM, ESCAPE), known, 2)
        doubt = law_doubt(law, EDGES, SODIUM)
        straight = np.tensordot(doubt.moments[:, :2] * (1.0, 3.0), known, 2)
        bound = bias_bound(doubt, EDGES, ESCAPE, known)
        rows = np.stack([np.abs(told - exact), np.abs(straight - exact), bound, exact], axis=1)
        for family, row in zip(families, rows, strict=True):
            if row[3] > 0.0:
                found.setdefault(family, []).append(row)
    return {family: np.array(rows) for family, rows in found.items()}


def ratios(rows: Floats) -> Floats:
    """Return excess over bound, what lies below the moments' rounding counted as nothing."""
    return rows[:, 0] / np.maximum(rows[:, 2], ROUNDING * rows[:, 3])


def report(least_held: float, most: float) -> bool:
    """Print a row for each family and return whether the bound holds."""
    print("| response | cases | excess | of two lines | bound | held by 1 | by 2 | worst |")
    print("|---|---|---|---|---|---|---|---|")
    found = table()
    every = np.concatenate(list(found.values()))
    for family, rows in [*found.items(), ("all", every)]:
        excess, straight, bound = (float(np.median(rows[:, i] / rows[:, 3])) for i in range(3))
        q = ratios(rows)
        held = [f"{100.0 * np.mean(q <= n):.2f} %" for n in (1.0, 2.0)]
        print(
            f"| {family} | {len(rows)} | {excess:.1e} | {straight:.1e} | {bound:.1e} | {' | '.join(held)} | "
            f"{q.max():.2f} |",
            flush=True,
        )
    q = ratios(every)
    return bool(np.mean(q <= 1.0) > least_held and q.max() < most)


if __name__ == "__main__":
    report(0.0, 0.0)
