"""Fields of a product ready to be drawn: one release or the sum over releases, with its standard error."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.product.layout import RELEASE, REPLICATE, REPLICATES, STANDARD_ERROR

LARGEST_RELATIVE_ERROR = 0.5
"""Standard error over value above which a cell says nothing."""


class Field(NamedTuple):
    """Values and their standard errors, of the same shape."""

    value: NDArray[np.float64]
    error: NDArray[np.float64]

    @property
    def hit(self) -> NDArray[np.bool_]:
        """Cells in which something was counted."""
        return np.isfinite(self.value) & (self.value > 0.0)

    @property
    def significant(self) -> NDArray[np.bool_]:
        """Cells whose standard error is known and at most half of the value."""
        return self.hit & (self.error <= LARGEST_RELATIVE_ERROR * self.value)


def releases(product: xr.Dataset, release: str | None) -> list[str]:
    """Return the names of the releases to be drawn: the one asked for, or all.

    Raises
    ------
    InputError
        Where the product has no such release.
    """
    names = [str(name) for name in product["release_name"].values]
    if release is None:
        return names
    if release not in names:
        raise InputError(f"there is no release {_quoted(release)}; allowed: {listed(names)}")
    return [release]


def listed(names: Sequence[str]) -> str:
    """Return names as a message shows them."""
    return ", ".join(_quoted(name) for name in names) or "none"


def released_words(names: Sequence[str]) -> str:
    """Return what is drawn, for a title: `release "vent"` or `sum of 3 releases`."""
    return f"release {_quoted(names[0])}" if len(names) == 1 else f"sum of {len(names)} releases"


def field(values: xr.DataArray, errors: xr.DataArray, factor: float) -> Field:
    """Return the sum over releases times `factor`, the unit's; other dimensions stay in their order.

    Releases are traced with random numbers of their own and hence independent: their variances add. A cell
    that a release never hit adds nothing.
    """
    with np.errstate(over="ignore", invalid="ignore", under="ignore"):
        # Scaled before squaring, or the squares of large errors would overflow.
        value = values.sum(RELEASE).values * factor
        largest = errors.max(RELEASE).fillna(0.0)
        scale = largest.where(largest > 0.0, 1.0)
        error = (largest * np.sqrt(((errors / scale) ** 2).sum(RELEASE))).values * factor
    return Field(value, np.where(errors.notnull().any(RELEASE).values, error, np.nan))


def variable(product: xr.Dataset, name: str, names: Sequence[str], factor: float) -> Field:
    """Return variable `name` summed over the releases `names`, times `factor`."""
    chosen = product[[name, name + STANDARD_ERROR]].sel(release=list(names))
    return field(chosen[name], chosen[name + STANDARD_ERROR], factor)


def mean_over_cells(
    product: xr.Dataset, name: str, names: Sequence[str], dimension: str, cells: Sequence[int], factor: float
) -> Field:
    """Return the mean of variable `name` over equally large neighbouring `cells` along `dimension`.

    Its error comes from the replicates, since cells of one flight are correlated. Where the replicates do not
    tell, it is the mean of the cells' errors, which no correlation can exceed (Cauchy and Schwarz).
    """
    chosen = product.isel({dimension: list(cells)}).sel(release=list(names))
    values = chosen[name].mean(dimension)
    bound = chosen[name + STANDARD_ERROR].fillna(0.0).mean(dimension)
    bound = bound.where(values > 0.0)
    replicates = name + REPLICATES
    if len(cells) == 1 or replicates not in chosen or chosen.sizes[REPLICATE] < 2:
        return field(values, bound, factor)
    with np.errstate(invalid="ignore", over="ignore"):
        spread = chosen[replicates].astype(np.float64).mean(dimension).std(REPLICATE, ddof=1)
    error = spread / np.sqrt(chosen.sizes[REPLICATE])
    # Replicates are kept in single precision, which has no very large and no very small numbers.
    return field(values, error.where(np.isfinite(error) & (error > 0.0), bound), factor)


def _quoted(name: str) -> str:
    return f'"{name}"'
