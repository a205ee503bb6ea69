"""Sums over cells or pixels, with errors from the replicates."""

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.plots.field import Field
from tracer.product.layout import RELEASE, REPLICATE, REPLICATES

Linear = Callable[[NDArray[Any]], NDArray[Any]]

BATCHES = "replicate_batches"
"""Attribute that says how many batches count into each replicate."""
NO_REPLICATES = "No error bands: the product keeps no replicates, from which errors of sums come."


def has_replicates(product: xr.Dataset, name: str) -> bool:
    """Return whether variable `name` has replicates enough for standard errors of sums."""
    return name + REPLICATES in product and product.sizes[REPLICATE] > 1


def summed(product: xr.Dataset, name: str, names: Sequence[str], add_up: Linear, factor: float) -> Field:
    """Return what `add_up` makes of variable `name`, summed over releases.

    Cells of one flight are correlated, so the error is how the same sum differs between replicates; a replicate
    of b batches varies as 1/b. It is NaN where there are no replicates, or where they are beyond single precision.

    Parameters
    ----------
    product : xarray.Dataset
        As `open_product` gives it.
    name : str
        A variable with the dimension `release`.
    names : sequence of str
        Releases to add up.
    add_up : callable
        Linear map of an array (..., cells) to one (..., sums); cells are the variable's dimensions but `release`.
    factor : float
        Of the unit.
    """
    chosen = product[name].sel(release=list(names))
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        value = add_up(chosen.transpose(RELEASE, ...).values).sum(axis=0) * factor
        if not has_replicates(product, name):
            return Field(value, np.full(value.shape, np.nan))
        return Field(value, _standard_error(*replicate_sums(product, name, names, add_up, factor)))


def replicate_sums(
    product: xr.Dataset, name: str, names: Sequence[str], add_up: Linear, factor: float
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return what `summed` adds up, for each replicate, shape (G, sums), and the batches in each, shape (G,)."""
    # One release at a time: in double precision all replicates at once would be large.
    each = product[name + REPLICATES].sel(release=list(names)).transpose(RELEASE, REPLICATE, ...)
    parts = sum(add_up(one.values.astype(np.float64)) for one in each) * factor
    return np.asarray(parts), batches_of_replicates(product)


def batches_of_replicates(product: xr.Dataset) -> NDArray[np.float64]:
    """Return how many batches each replicate of the product stands for; one each where it does not say."""
    groups = product.sizes[REPLICATE]
    counts = np.atleast_1d(np.asarray(product.attrs.get(BATCHES, ()), dtype=np.float64))
    return counts if counts.size == groups else np.ones(groups)


def _standard_error(parts: NDArray[np.float64], batches: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return sqrt(sum_i b_i (x_i - x)^2/((G - 1) B)) over the first axis; NaN where that is no number above 0."""
    share = (batches / batches.sum()).reshape(-1, *([1] * (parts.ndim - 1)))
    largest = np.max(np.abs(parts), axis=0)
    # The largest squared must fit.
    scaled = parts / np.where(largest > 0.0, largest, 1.0)
    spread = np.sum(share * (scaled - np.sum(share * scaled, axis=0)) ** 2, axis=0)
    error = largest * np.sqrt(spread / (len(batches) - 1))
    return np.asarray(np.where(np.isfinite(error) & (error > 0.0), error, np.nan))
