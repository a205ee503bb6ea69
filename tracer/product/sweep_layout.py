"""Variables of a sweep's product: those of a run behind the swept dimensions, and what each point says of itself."""

from collections.abc import Container, Mapping, Sequence
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.product.layout import LABELS, LANDMARKS, ROWS, why_other_version

KIND, SWEEP = "product_kind", "sweep"
"""The attribute that tells a sweep's product from a run's, which has none, and its value."""
DIMENSIONS = "swept_dimensions"
"""Attribute: names of the leading dimensions, with spaces between."""
SWEEP_HASH = "sweep_hash"
POINT = "point"
"""Dimension of paired axes, and beginning of the names of what points say of themselves."""
NAME = "_name"
"""Ending of the variable that holds the words along a swept dimension."""

POINT_ATTRIBUTES = "point_attributes"
POINT_WORDS = {
    "scene_hash": "scene hash of the point's run",
    "run_hash": "run hash of the point's run",
}
"""Attributes of a point's own product that are kept as variables of text, with their long names."""
POINT_TEXTS = (POINT_ATTRIBUTES, *(f"{POINT}_{name}" for name in POINT_WORDS))


class PointFigure(NamedTuple):
    """A global attribute of a point's own product that is a number, as a variable."""

    attribute: str
    unit: str
    long_name: str

    @property
    def name(self) -> str:
        """Name of the variable."""
        return f"{POINT}_{self.attribute}"


POINT_FIGURES = (
    PointFigure("batches", "1", "batches traced"),
    PointFigure("flights", "1", "launches traced"),
    PointFigure("integration_steps", "1", "steps of the integrator"),
    PointFigure("kernel_seconds", "s", "processor time in kernels, summed over workers"),
    PointFigure("wall_seconds", "s", "time from the first batch's start to the last fold"),
    PointFigure("sun_distance", "m", "distance of the body from the Sun"),
    PointFigure("sun_radial_velocity", "m s-1", "heliocentric radial velocity, positive away from the Sun"),
    PointFigure("stop_reached", "1", "1 where the relative error asked for was reached, otherwise 0"),
    PointFigure("stop_relative_error", "1", "relative error of the region's mean when the point ended"),
)
"""NaN where a point does not say."""

FIXED = tuple(row.name for row in ROWS if not row.tallied and row.name != "surface_temperature")
"""Variables that all points share; coordinates and their bounds are such as well."""


class SweptAxis(NamedTuple):
    """The values of one axis: numbers in SI units, angles in degrees, or words, along `dimension`.

    `attributes` are those of its variable. Numbers along a dimension of their own name are its coordinate.
    """

    name: str
    dimension: str
    values: NDArray[Any]
    attributes: Mapping[str, str]

    @property
    def is_text(self) -> bool:
        """Whether the values are words."""
        return self.values.dtype.kind not in "fiu"

    @property
    def variable(self) -> str:
        """Name of the variable that holds the values."""
        return self.name + NAME if self.is_text else self.name


def swept_dimensions(attributes: Mapping[Any, Any]) -> tuple[str, ...]:
    """Return the leading dimensions of a sweep's product, by its global attributes."""
    return tuple(str(attributes.get(DIMENSIONS, "")).split())


def reserved_names() -> set[str]:
    """Return names that no axis may bear, whatever the images are called."""
    return {POINT, *(label.dimension for label in LABELS), *(label.variable for label in LABELS)}


def why_no_sweep(attributes: Mapping[Any, Any], variables: Container[Any]) -> str | None:
    """Return why these attributes and variables are no sweep's product that this package knows; None if they are."""
    if attributes.get("product_version") is None or any(name not in variables for name in LANDMARKS):
        return "is not a product of this program"
    if attributes.get(KIND) != SWEEP:
        return "is the product of a run, not of a sweep"
    if POINT_ATTRIBUTES not in variables or not swept_dimensions(attributes):
        return "is damaged: it does not say what was swept"
    return why_other_version(attributes)


def shape_of(axes: Sequence[SweptAxis]) -> dict[str, int]:
    """Return the swept dimensions with their lengths, in order."""
    return {axis.dimension: len(axis.values) for axis in axes}


def number_of(value: Any) -> float:
    """Return a point's attribute as a number, NaN where it is none."""
    return float(value) if np.ndim(value) == 0 and isinstance(value, int | float | np.number) else np.nan
