"""Means, errors and replicates of several shares of one run, as the whole run would have had them.

A share is known by its number of batches, the mean over them and the standard error of that mean: together as good as
the sums themselves.
"""

from collections.abc import Iterable, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


def combined_mean(means: Sequence[Floats], batches: Sequence[int]) -> Floats:
    """Return the mean over all batches.

    Parameters
    ----------
    means : sequence of ndarray
        Each share's mean over its batches, all of one shape.
    batches : sequence of int
        Each share's number of batches.
    """
    total = 0
    mean = np.zeros_like(means[0], dtype=np.float64)
    for one, count in zip(means, batches, strict=True):
        total += count
        mean += (one - mean) * (count / total)
    return mean


def combined_error(means: Sequence[Floats], errors: Sequence[Floats], batches: Sequence[int]) -> Floats:
    """Return the standard error of the mean over all batches; NaN where nothing was ever scored.

    The sums of squared deviations add up with what the shares' means differ by (Chan, Golub & LeVeque 1983, Am. Stat.
    37, 242).

    Parameters
    ----------
    means, errors : sequence of ndarray
        Each share's mean and its standard error; errors are NaN where the mean is 0 or the share has one batch.
    batches : sequence of int
        Each share's number of batches.
    """
    total = 0
    mean = np.zeros_like(means[0], dtype=np.float64)
    squared_deviation = np.zeros_like(mean)
    for one, error, count in zip(means, errors, batches, strict=True):
        deviation = one - mean
        squared_deviation += np.nan_to_num(error, nan=0.0) ** 2 * (count * (count - 1))
        squared_deviation += deviation**2 * (total * count / (total + count))
        total += count
        mean += deviation * (count / total)
    if total < 2:
        return np.full_like(mean, np.nan)
    combined = np.sqrt(squared_deviation / (total * (total - 1)))
    return np.where(mean == 0.0, np.nan, combined)


class Replicates(NamedTuple):
    """How one share's batches are grouped.

    `batches` counts those of each group. `numbers` names each group's batch where every group holds a single one whose
    number is known; else it is empty.
    """

    batches: tuple[int, ...]
    numbers: tuple[int, ...] = ()


class Part(NamedTuple):
    """A share's group, and how many batches it stands for."""

    share: int
    group: int
    batches: int


def regrouped(shares: Sequence[Replicates], wanted: int) -> list[list[Part]]:
    """Return which groups of the shares make up each group of the whole, so that each gets whole groups only.

    Where all shares have as many groups as are `wanted`, they are put together by number, as one run groups its
    batches. Groups of a single known batch go where one run would have put it; all others to the group that has the
    fewest batches so far.

    Parameters
    ----------
    shares : sequence of Replicates
        In their order; a share without groups leaves the whole without.
    wanted : int
        Groups to make; there are fewer where the shares have fewer altogether.
    """
    if not all(share.batches for share in shares):
        return []
    groups = min(wanted, sum(len(share.batches) for share in shares))
    made: list[list[Part]] = [[] for _ in range(groups)]
    homeless: list[Part] = []
    for number, share in enumerate(shares):
        for group, count in enumerate(share.batches):
            part = Part(number, group, count)
            if share.numbers:
                made[share.numbers[group] % groups].append(part)
            elif len(share.batches) == groups:
                made[group].append(part)
            else:
                homeless.append(part)
    for part in homeless:
        min(made, key=batches_of).append(part)
    return [parts for parts in made if parts]


def batches_of(parts: Iterable[Part]) -> int:
    """Return the batches that a group's parts stand for."""
    return sum(part.batches for part in parts)
