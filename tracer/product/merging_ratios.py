"""Means and widths of several products put together: ratios of sums, never averages of ratios."""

from collections.abc import Sequence

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.product.layout import REPLICATES, STANDARD_ERROR, Ratio
from tracer.product.lazy import Key, lazy_variable
from tracer.tally.combining import Part, batches_of
from tracer.tally.velocity_moments import Moments, jackknife_errors, joined


def merged_ratio(
    name: str, names: Ratio, stored: Sequence[xr.Dataset], batches: Sequence[int], parts: list[list[Part]]
) -> xr.Variable:
    """Return a mean or width, its standard error or its replicates, of all products together; lazy.

    Parameters
    ----------
    name : str
        The variable.
    names : Ratio
        What weighs it, and the variables of mean and width.
    stored : sequence of Dataset
        The products as in their files.
    batches : sequence of int
        Each product's number of batches.
    parts : list of list of Part
        What makes up each replicate of the whole; empty without replicates.
    """
    first = stored[0].variables[name]
    which = 1 if name.removesuffix(STANDARD_ERROR).removesuffix(REPLICATES) == names.mean else 2
    shape = first.shape
    if name.endswith(REPLICATES):
        shape = (len(parts), *first.shape[1:])

        def read(key: Key) -> NDArray[np.floating]:
            chosen = parts[key[0]] if isinstance(key[0], slice) else [parts[key[0]]]
            rows = np.array([_group(names, stored, group, key[1:])[which] for group in chosen], np.float32)
            return rows if isinstance(key[0], slice) else rows[0]

    elif name.endswith(STANDARD_ERROR):

        def read(key: Key) -> NDArray[np.floating]:
            if not parts:
                return np.full_like(np.asarray(first[key].values), np.nan)
            groups = [_group(names, stored, group, key) for group in parts]
            return jackknife_errors(groups, [batches_of(group) for group in parts])[which - 1]

    else:

        def read(key: Key) -> NDArray[np.floating]:
            return joined([_moments(names, ds, key) for ds in stored], batches)[which]

    return lazy_variable(first.dims, shape, first.dtype, read, first.attrs)


def _group(names: Ratio, stored: Sequence[xr.Dataset], group: Sequence[Part], key: Key) -> Moments:
    """Return the moments of one replicate of the whole, in single precision as a product keeps them."""
    made = joined(
        [_moments(names, stored[part.share], (part.group, *key), REPLICATES) for part in group],
        [part.batches for part in group],
    )
    return Moments(made.weight / batches_of(group), made.mean, made.width)


def _moments(names: Ratio, ds: xr.Dataset, key: Key, ending: str = "") -> Moments:
    weight, mean, width = (np.asarray(ds.variables[name + ending][key].values, np.float64) for name in names)
    return Moments(weight, mean, width)
