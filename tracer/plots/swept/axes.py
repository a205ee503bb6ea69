"""Swept dimensions as figures show them: values in the units of the sweep file, and how the points lie."""

from typing import NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.plots.lengths import body_radius
from tracer.product.sweep_layout import swept_dimensions
from tracer.units import RADII, conversion_factor

KEY, UNIT, WRITTEN = "run_file_key", "units", "written_unit"
MOST_LINES = 6
"""Values of the second dimension that become lines of their own; more become a map in colours."""
LOG_SPAN = 20.0
"""Ratio of the ends above which values in equal ratios lie on a logarithmic axis."""
SHORT_UNITS = {"degree": "deg", "1": ""}


class Values(NamedTuple):
    """The values along a swept dimension: `numbers` as they are read, or places 0, 1, ... of `words`."""

    name: str
    unit: str
    numbers: NDArray[np.float64]
    words: tuple[str, ...]
    are_words: bool
    others: tuple[str, ...]
    """Names of what varies along with them."""

    @property
    def label(self) -> str:
        """What stands beside an axis."""
        name = self.name[:1].upper() + self.name[1:]
        return f"{name} ({self.unit})" if self.unit else name

    @property
    def is_logarithmic(self) -> bool:
        """Whether the values go in about equal ratios over a wide span."""
        if self.are_words or len(self.numbers) < 3 or not np.all(self.numbers > 0.0):
            return False
        steps = np.abs(np.diff(np.log(self.numbers)))
        return bool(steps.sum() > np.log(LOG_SPAN) and steps.max() < 1.5 * steps.min())


class Points(NamedTuple):
    """How the points of a sweep lie: numbers from 1, shape (F, N), over `family` (None where F is 1) and `along`."""

    along: Values
    family: Values | None
    numbers: NDArray[np.int64]

    @property
    def as_map(self) -> bool:
        """Whether there are too many of the family for lines."""
        return self.family is not None and len(self.family.words) > MOST_LINES


def points_of(sweep: xr.Dataset) -> Points:
    """Return how the points of a sweep's product lie, the longer dimension along the axis.

    Raises
    ------
    InputError
        More than two swept dimensions.
    """
    dimensions = swept_dimensions(sweep.attrs)
    if len(dimensions) > 2:
        raise InputError(
            f"the sweep has {len(dimensions)} dimensions, {', '.join(dimensions)}; a figure shows at most two: make a "
            "sweep with fewer axes, or draw a part of it from Python"
        )
    lengths = [sweep.sizes[axis] for axis in dimensions]
    numbers = 1 + np.arange(int(np.prod(lengths))).reshape(lengths)
    if len(dimensions) == 1:
        along, order = _sorted(_values(sweep, dimensions[0]))
        return Points(along, None, numbers[order][np.newaxis])
    first, second = (_values(sweep, axis) for axis in dimensions)
    if lengths[1] > lengths[0]:
        return Points(second, first, numbers)
    return Points(first, second, numbers.T)


def _values(sweep: xr.Dataset, dimension: str) -> Values:
    found = [
        str(name) for name, one in sweep.variables.items() if KEY in one.attrs and one.dims == (dimension,)
    ]
    if not found:
        raise InputError(f"the sweep does not tell the values along {dimension}")
    names = [str(sweep[name].attrs.get("long_name", name)) for name in found]
    one = sweep[found[0]]
    if one.dtype.kind not in "fiu":
        words = tuple(map(str, one.values))
        return Values(names[0], "", np.arange(len(words), dtype=np.float64), words, True, tuple(names[1:]))
    unit, factor = _reading_unit(sweep, one)
    numbers = one.values.astype(np.float64) * factor
    words = tuple(f"{number:.4g} {unit}".rstrip() for number in numbers)
    return Values(names[0], unit, numbers, words, False, tuple(names[1:]))


def _reading_unit(sweep: xr.Dataset, one: xr.DataArray) -> tuple[str, float]:
    """Return the unit in which the sweep file gives the values, and the factor from the product's unit."""
    unit, written = str(one.attrs.get(UNIT, "1")), str(one.attrs.get(WRITTEN, ""))
    if written == RADII:
        return "body radii", 1.0 / body_radius(sweep)
    factor = conversion_factor(unit, written) if written else None
    return (SHORT_UNITS.get(unit, unit), 1.0) if factor is None else (written, factor)


def _sorted(values: Values) -> tuple[Values, NDArray[np.int64]]:
    """Return paired values in rising order, with their places before."""
    order = np.argsort(values.numbers, kind="stable")
    words = tuple(values.words[i] for i in order)
    return values._replace(numbers=values.numbers[order], words=words), order
