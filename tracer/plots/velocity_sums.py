"""Velocities of a product ready to be drawn: of all releases together, by pixel and in parts of an image."""

from collections.abc import Callable, Sequence
from typing import NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.plots.apertures import Aperture
from tracer.plots.field import LARGEST_RELATIVE_ERROR, Field
from tracer.plots.reading_units import KILOMETRES_PER_SECOND
from tracer.plots.sums import batches_of_replicates, has_replicates, summed
from tracer.product.layout import RELEASE, REPLICATE, REPLICATES, Ratio
from tracer.tally.velocity_moments import Moments, added_up, jackknife_errors, joined

Floats = NDArray[np.float64]


class Velocities(NamedTuple):
    """Mean and width of the velocity and their standard errors [km s-1], of one shape; NaN where unknown."""

    mean: Floats
    mean_error: Floats
    width: Floats
    width_error: Floats

    @property
    def hit(self) -> NDArray[np.bool_]:
        """Where something was counted."""
        return np.isfinite(self.mean)

    @property
    def significant(self) -> NDArray[np.bool_]:
        """Where both standard errors are known and at most half of the width."""
        most = LARGEST_RELATIVE_ERROR * self.width
        return self.hit & (self.mean_error <= most) & (self.width_error <= most)


def velocities_by_pixel(product: xr.Dataset, variables: Ratio, names: Sequence[str]) -> Velocities:
    """Return the velocities in each pixel of an image, of the releases `names` together."""
    return _velocities(product, variables, names, lambda releases: joined(releases, [1] * len(releases)))


def velocities_in(
    product: xr.Dataset, variables: Ratio, names: Sequence[str], parts: Sequence[Aperture]
) -> Velocities:
    """Return the velocities in each of the `parts` of an image, of the releases `names` together."""
    return _velocities(product, variables, names, lambda releases: _in_parts(releases, parts))


def profiles(
    product: xr.Dataset, name: str, names: Sequence[str], parts: Sequence[Aperture], factor: float
) -> list[Field]:
    """Return the line profile in each of the `parts`: the mean over its pixels of variable `name`, by bin."""
    dimensions = ("part", "bin")
    small = xr.Dataset(attrs=product.attrs)
    for ending in ("", REPLICATES):
        if name + ending in product:
            values = product[name + ending].transpose(..., *product[name].dims[-3:])
            leading = values.dims[:-3]
            small[name + ending] = ((*leading, *dimensions), _means(values.values, parts))
    small = small.assign_coords({RELEASE: product[RELEASE]})
    whole = summed(small, name, names, lambda cells: cells, factor)
    return [Field(value, error) for value, error in zip(whole.value, whole.error, strict=True)]


def _means(values: NDArray[np.floating], parts: Sequence[Aperture]) -> Floats:
    """Return means over the pixels of each part: from (..., bins, rows, columns) to (..., parts, bins)."""
    shares = np.array([part.pixels.ravel() / part.pixels.sum() for part in parts])
    made = np.empty((*values.shape[:-3], len(parts), values.shape[-3]))
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        # One replicate at a time: in double precision all at once would be large.
        for place in np.ndindex(values.shape[:-3]):
            pixels = values[place].reshape(values.shape[-3], -1).astype(np.float64)
            made[place] = shares @ pixels.T
    return made


def _velocities(
    product: xr.Dataset,
    variables: Ratio,
    names: Sequence[str],
    add: Callable[[Sequence[Moments]], Moments],
) -> Velocities:
    """Return the velocities of what `add` makes of the moments of all releases, with errors from the replicates."""
    factor = KILOMETRES_PER_SECOND
    chosen = product.sel(release=list(names))
    largest = float(np.max(chosen[variables.weight].values, initial=0.0))
    scale = largest if largest > 0.0 else 1.0
    whole = add(_moments(chosen, variables, "", scale))
    errors = [np.full_like(whole.mean, np.nan)] * 2
    if has_replicates(product, variables.mean):
        each = (chosen.isel({REPLICATE: one}) for one in range(product.sizes[REPLICATE]))
        groups = [add(_moments(one, variables, REPLICATES, scale)) for one in each]
        errors = list(jackknife_errors(groups, list(batches_of_replicates(product))))
    return Velocities(whole.mean * factor, errors[0] * factor, whole.width * factor, errors[1] * factor)


def _moments(product: xr.Dataset, variables: Ratio, ending: str, scale: float) -> list[Moments]:
    """Return the moments of each release, with weights over `scale`: large ones would overflow when multiplied."""
    arrays = [product[name + ending].transpose(RELEASE, ...).values.astype(np.float64) for name in variables]
    return [Moments(*parts) for parts in zip(arrays[0] / scale, *arrays[1:], strict=True)]


def _in_parts(releases: Sequence[Moments], parts: Sequence[Aperture]) -> Moments:
    every = [np.stack([one[field] for one in releases]) for field in range(len(Moments._fields))]
    added = [added_up(Moments(*(values[:, part.pixels].ravel() for values in every))) for part in parts]
    return Moments(*(np.array(values) for values in zip(*added, strict=True)))
