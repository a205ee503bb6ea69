"""How often numbers of two runs lie within their errors of each other, where nothing but chance is between them."""

import itertools
import sys
from collections.abc import Iterable, Sequence
from typing import NamedTuple

import numpy as np
import xarray as xr
from run import FIELDS, KNOWN, LAWS, SCENES, product_of

from tracer.observe.responses import SCATTER, evaluate_law

SEEDS = ((1, 2), (3, 4), (5, 6), (7, 8), (9, 10), (11, 12), (13, 14), (15, 16))
"""Seeds of the run with responses and of the runs of each law."""
SHUFFLES = 20
MOST_ERRORS = 3.0
"""Standard errors, of a mean over the pairs, by which a law may fail: one in a hundred by chance (Student's t, 7)."""
MOST_OF_ALL = 2.4
"""The same of the mean over all laws, to either side: one in twenty."""

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


def averaged(runs: Sequence[Numbers]) -> Numbers:
    """Return the mean of runs of one seed each: Monte Carlo errors fall, what the bins' width does stays."""
    value = np.mean([one.value for one in runs], axis=0)
    scatter = np.sqrt(np.sum([one.scatter**2 for one in runs], axis=0)) / len(runs)
    bias = np.mean([np.sqrt(np.maximum(one.error**2 - one.scatter**2, 0.0)) for one in runs], axis=0)
    return Numbers(value, np.hypot(scatter, bias), scatter, np.concatenate([one.batches for one in runs]))


def mean_and_error(values: Sequence[float]) -> tuple[float, float]:
    """Return the mean of independent values and its standard error."""
    return float(np.mean(values)), float(np.std(values, ddof=1)) / len(values) ** 0.5


def agrees(
    law: str, ours: Sequence[Numbers], runs: Sequence[Numbers], due: float
) -> tuple[bool, list[float]]:
    """Print how independent pairs of a law deviate, and return whether they agree and the mean squares of the pairs.

    `due` is the share within one error of what is independent by construction.
    """
    pairs = [deviations(a.value, a.error, b.value, b.error) for a, b in zip(ours, runs, strict=True)]
    squares = [float(np.mean(known**2)) for _, known in pairs]
    square, error = mean_and_error(squares)
    share, share_error = mean_and_error([float(np.mean(z <= 1.0)) for z, _ in pairs])
    one, other = averaged(ours), averaged(runs)
    together = float(np.mean(deviations(one.value, one.error, other.value, other.error)[1] ** 2))
    scatter = error * len(pairs) ** 0.5
    holds = square < 1.0 + MOST_ERRORS * error and share > due - MOST_ERRORS * share_error
    holds &= together < 1.0 + MOST_ERRORS * scatter
    print(
        f"| {law} | {square:.2f} +- {error:.2f} | {scatter:.2f} | {100.0 * share:.1f} +- {100.0 * share_error:.1f} | "
        f"{100.0 * due:.1f} | {together:.2f} | {'holds' if holds else 'fails'} |",
        flush=True,
    )
    return holds, squares


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


def rows_of(ours: Sequence[Numbers], runs: Sequence[Numbers]) -> dict[str, list[tuple[Floats, Floats]]]:
    """Return the deviations of what stands beside each other, by what it is."""
    return {
        "responses and runs": [
            deviations(a.value, a.error, b.value, b.error) for a, b in itertools.product(ours, runs)
        ],
        "runs": [deviations(a.value, a.error, b.value, b.error) for a, b in itertools.combinations(runs, 2)],
        "responses": [
            deviations(a.value, a.scatter, b.value, b.scatter) for a, b in itertools.combinations(ours, 2)
        ],
        "shuffled batches of runs": shuffled(runs),
        "shuffled batches of responses": shuffled(ours),
    }


def main() -> int:
    """Print two tables for the scene in sunlight; the exit code says whether responses and runs agree."""
    text, particles, laws = SCENES["sunlit"]
    responding = [product_of(text, "1200 K", particles, seed, "speed_bins = 32") for seed, _ in SEEDS]
    rows: list[str] = []
    verdicts, squares = [], []
    print("| law | square | of one pair | in 1, % | due | means | |")
    print("|---|---|---|---|---|---|---|")
    for law in laws:
        ours = [numbers_of(evaluate_law(one, "vapour", LAWS[law]), SCATTER) for one in responding]
        runs = [
            numbers_of(product_of(text, law, particles, seed, 'emphasis = "far"'), "_standard_error")
            for _, seed in SEEDS
        ]
        found = rows_of(ours, runs)
        rows += [f"| {law} | {name} | {row(pairs)} |" for name, pairs in found.items()]
        due = float(np.mean(np.concatenate([z for z, _ in found["shuffled batches of runs"]]) <= 1.0))
        held, each = agrees(law, ours, runs, due)
        verdicts.append(held)
        squares.append(each)
    mean, error = mean_and_error(list(np.mean(squares, axis=0)))
    verdicts.append(abs(mean - 1.0) < MOST_OF_ALL * error)
    print(f"all laws: {mean:.2f} +- {error:.2f}, {'holds' if verdicts[-1] else 'fails'}")
    print("| law | between | in 1, % | in 2 | in 3 | pairs, in 1 | scatter | square |")
    print("|---|---|---|---|---|---|---|---|")
    print("\n".join(rows))
    return 0 if all(verdicts) else 1


if __name__ == "__main__":
    sys.exit(main())
