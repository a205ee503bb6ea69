"""Mean and width of the velocity along a line of sight, their errors, and how shares of a run are put together.

Both are ratios of sums. So they are never averaged: where parts of a run are joined, each counts with what it holds.
Errors come from leaving out one replicate after the other.
"""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

LEAST_GROUPS = 4
"""Replicates that must have counted something for a ratio to have an error: three differences between them."""

ROUNDING = 1e-13
"""Part of a mean square that rounding may leave of the difference of it and the square of the mean: some hundred times
that of one sum. The root is 3e-7, so that widths of 1 mm/s some km/s from the origin are told from none."""

PLACES_AT_A_TIME = 8_192
"""So that leaving out every group of a large image takes little memory."""


class Moments(NamedTuple):
    """How much there is, `weight`, its mean velocity and its standard deviation, `width` [m s-1]; arrays of one shape.

    Mean and width are NaN where there is nothing.
    """

    weight: Floats
    mean: Floats
    width: Floats


def from_sums(weight: Floats, linear: Floats, square: Floats, origin: float | Floats) -> Moments:
    """Return the moments of sums of `weight`, of weight times v and of weight times v squared, v counted from `origin`.

    Rounding takes digits from the width where the mean lies many widths from the origin; a square of the width that is
    no more than `ROUNDING` of the mean square is nothing, such as that of a single sample.
    """
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        mean = np.where(weight > 0.0, linear / weight, np.nan)
        mean_square = np.where(weight > 0.0, square / weight, np.nan)
        variance = mean_square - mean * mean
        width = np.sqrt(np.where(variance <= ROUNDING * mean_square, 0.0, variance))
    return Moments(weight, origin + mean, width)


def joined(parts: Sequence[Moments], batches: Sequence[float]) -> Moments:
    """Return the moments of all parts together, each the mean over so many `batches`.

    The mean square about the common mean is that inside the parts and that of their means (law of total variance).
    """
    return _left(_sums(parts, batches), None)


def added_up(moments: Moments) -> Moments:
    """Return the moments of all places along the first axis together."""
    return _left(_sums_of(*moments), None)


def jackknife_errors(groups: Sequence[Moments], batches: Sequence[float]) -> tuple[Floats, Floats]:
    """Return the standard errors of mean and width of all `groups` together, from leaving out one after the other.

    The delete-m jackknife for groups of unequal size (Busing, Meijer & van der Leeden 1999, Stat. Comput. 9, 3,
    doi:10.1023/A:1008800423698: memory); with equal groups it is the jackknife of Tukey.

    Parameters
    ----------
    groups : sequence of Moments
        Of independent groups of batches.
    batches : sequence of float
        How many batches each group stands for.

    Returns
    -------
    (ndarray, ndarray)
        [m s-1], NaN where fewer than `LEAST_GROUPS` groups have counted anything.
    """
    shape = groups[0].weight.shape
    flat = [Moments(*(np.reshape(part, -1) for part in group)) for group in groups]
    errors = np.empty((2, groups[0].weight.size))
    for start in range(0, errors.shape[1], PLACES_AT_A_TIME):
        block = slice(start, start + PLACES_AT_A_TIME)
        errors[:, block] = _errors([Moments(*(part[block] for part in group)) for group in flat], batches)
    return errors[0].reshape(shape), errors[1].reshape(shape)


def _errors(groups: Sequence[Moments], batches: Sequence[float]) -> Floats:
    sums = _sums(groups, batches)
    whole = _left(sums, None)
    count, total = len(groups), float(sum(batches))
    pseudo: list[list[Floats]] = [[], []]
    for group, own in enumerate(batches):
        per_share = total / own
        rest = _left(sums, group)
        for kept, full, without in zip(pseudo, whole[1:], rest[1:], strict=True):
            kept.append(per_share * full - (per_share - 1.0) * without)
    share = np.array(batches, dtype=np.float64).reshape(-1, 1) / total
    known = (sums.weights > 0.0).sum(axis=0) >= LEAST_GROUPS
    errors = np.full((2, whole.mean.size), np.nan)
    if not known.any():
        return errors
    for error, values in zip(errors, map(np.array, pseudo), strict=True):
        deviation = values - (share * values).sum(axis=0)
        variance = (deviation * deviation * share / (1.0 - share)).sum(axis=0) / count
        error[known] = np.sqrt(variance[known])
    return errors


class _Sums(NamedTuple):
    """Sums of each part and of all, counted from the `origin` [m s-1] of each place."""

    origin: Floats
    weights: Floats
    linear: Floats
    square: Floats


def _sums(parts: Sequence[Moments], batches: Sequence[float]) -> _Sums:
    weights = np.array([part.weight * count for part, count in zip(parts, batches, strict=True)], np.float64)
    return _sums_of(weights, *(np.array([part[i] for part in parts], np.float64) for i in (1, 2)))


def _sums_of(weights: Floats, means: Floats, widths: Floats) -> _Sums:
    means, widths = np.nan_to_num(means), np.nan_to_num(widths)
    whole = weights.sum(axis=0)
    with np.errstate(divide="ignore", invalid="ignore"):
        origin = np.where(whole > 0.0, (weights * means).sum(axis=0) / whole, 0.0)
    offsets = means - origin
    return _Sums(origin, weights, weights * offsets, weights * (widths * widths + offsets * offsets))


def _left(sums: _Sums, without: int | None) -> Moments:
    """Return the moments of all parts but one."""
    weight, linear, square = (
        part.sum(axis=0) - (0.0 if without is None else part[without]) for part in sums[1:]
    )
    # What is left of a sum by rounding is nothing.
    left = np.where(weight > 1e-12 * sums.weights.sum(axis=0), weight, 0.0)
    return from_sums(left, linear, square, sums.origin)
