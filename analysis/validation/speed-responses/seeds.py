"""How often numbers of two runs lie within their errors of each other, where nothing but chance is between them."""

import itertools
import sys
from collections.abc import Iterable, Sequence
from typing import NamedTuple

import numpy as np
import xarray as xr
from run import FIELDS, KNOWN, LAWS, SCENES, product_of

from tracer.observe.responses import SCATTER, evaluate_law

SEEDS = ((1, 2), (3, 4), (5, 6))
"""Seeds of the run with responses and of the runs of each law."""
SHUFFLES = 20

Floats = np.ndarray


class Numbers(NamedTuple):
    """All numbers of a run: `value`, stated `error`, Monte Carlo error `scatter` (n,), and by batch, (batches, n)."""

    value: Floats
    error: Floats
    scatter: Floats
    batches: Floats


def numbers_of(product: xr.Dataset, scatter: str) -> Numbers:
    """Return the numbers of a run, whose Monte Carlo errors have this ending."""
    names = [name for name in FIELDS if name in product]
    value, error, monte_carlo = (
        np.concatenate([product[name + ending].values.ravel() for name in names])
        for ending in ("", "_standard_error", scatter)
    )
    groups = [product[f"{name}_replicates"].transpose("replicate", ...).values for name in names]
    batches = np.concatenate([one.reshape(len(one), -1) for one in groups], axis=1)
    return Numbers(value, error, monte_carlo, batches.astype(np.float64))


def deviations(value: Floats, error: Floats, other: Floats, other_error: Floats) -> tuple[Floats, Floats]:
    """Return deviations over their errors of all numbers that both know, and of those known to 20 %."""
    both = np.isfinite(error) & np.isfinite(other_error) & (value != 0.0) & (other != 0.0)
    known = both & (error < KNOWN * np.abs(value)) & (other_error < KNOWN * np.abs(other))
    with np.errstate(invalid="ignore", divide="ignore"):
        z = np.abs(value - other) / np.hypot(error, other_error)
    return z[both], z[known]


def shuffled(runs: Sequence[Numbers]) -> list[tuple[Floats, Floats]]:
    """Return deviations between two halves, drawn at random, of the batches of several runs of one seed each.

    They have the same values and the same tails, and are independent by construction.
    """
    rng = np.random.default_rng(20310903)
    every = np.concatenate([one.batches for one in runs])
    count = len(every) // len(runs)
    found = []
    for _ in range(SHUFFLES):
        order = rng.permutation(len(every))
        halves = [every[order[:count]], every[order[count : 2 * count]]]
        parts = [(half.mean(axis=0), half.std(axis=0, ddof=1) / count**0.5) for half in halves]
        found.append(deviations(*parts[0], *parts[1]))
    return found


def row(pairs: Iterable[tuple[Floats, Floats]]) -> str:
    """Return the cells of a table: shares within 1, 2 and 3 errors, their scatter within 1, and the mean square."""
    every = list(pairs)
    z, known = (np.concatenate(part) for part in zip(*every, strict=True))
    alone = [100.0 * float(np.mean(one <= 1.0)) for one, _ in every]
    shares = " | ".join(f"{100.0 * np.mean(z <= n):.1f}" for n in (1, 2, 3))
    return f"{shares} | {min(alone):.1f} to {max(alone):.1f} | {np.std(alone, ddof=1):.1f} | {np.mean(known**2):.2f}"


def main() -> int:
    """Print the table for the scene in sunlight."""
    text, particles, laws = SCENES["sunlit"]
    responding = [product_of(text, "1200 K", particles, seed, "speed_bins = 32") for seed, _ in SEEDS]
    print("| law | between | in 1, % | in 2 | in 3 | pairs, in 1 | scatter | square |")
    print("|---|---|---|---|---|---|---|---|")
    for law in laws:
        ours = [numbers_of(evaluate_law(one, "vapour", LAWS[law]), SCATTER) for one in responding]
        runs = [
            numbers_of(product_of(text, law, particles, seed, 'emphasis = "far"'), "_standard_error")
            for _, seed in SEEDS
        ]
        rows = {
            "responses and runs": (
                deviations(a.value, a.error, b.value, b.error) for a, b in itertools.product(ours, runs)
            ),
            "runs": (
                deviations(a.value, a.error, b.value, b.error) for a, b in itertools.combinations(runs, 2)
            ),
            "responses": (
                deviations(a.value, a.scatter, b.value, b.scatter) for a, b in itertools.combinations(ours, 2)
            ),
            "shuffled batches of runs": shuffled(runs),
            "shuffled batches of responses": shuffled(ours),
        }
        for name, pairs in rows.items():
            print(f"| {law} | {name} | {row(pairs)} |", flush=True)
    return 0


if __name__ == "__main__":
    sys.exit(main())
