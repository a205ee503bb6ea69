"""Run until good enough: the relative error of a region's mean, judged at 20, 40, 80, ... batches.

The region's mean is its content over its volume or area, which has no error: so the content alone is followed. Each
batch gives one number, and what lies between cells of one batch is in it.
"""

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.engine.refusal import refuse
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.stop import RegionTable, StopTable
from tracer.engine.scene import Scene
from tracer.product.layout import (
    ADSORBED_COLUMN,
    ALTITUDE,
    HORIZONTAL,
    IMAGE,
    LATITUDE,
    LINE,
    LOCAL_TIME,
    RELEASE,
    VERTICAL,
    Variable,
    layout,
)
from tracer.tally.axes import middles
from tracer.tally.buffer import BufferLayout, tally_views
from tracer.tally.normalizing import product_fields
from tracer.units import Quantity, si

FIRST_DECISION = 20
"""Batches before the first decision; each further one comes at twice as many."""

Numbers = NDArray[np.float64]
Mask = NDArray[np.bool_]


class StopRule(NamedTuple):
    """Where a region's numbers stand in a batch's buffer, and how well their sum must be known."""

    places: NDArray[np.int64]
    """Indices into the buffer of one release."""
    release: int | None
    """The release that counts; None for the sum over all."""
    relative_error: float
    most: int

    def content(self, release: int, buffer: Numbers) -> float:
        """Return what the region holds in one batch of one release."""
        if self.release is not None and release != self.release:
            return 0.0
        return float(buffer[self.places].sum())

    def is_due(self, batches: int) -> bool:
        """Whether a decision falls due after so many batches."""
        doublings, rest = divmod(batches, FIRST_DECISION)
        return batches == self.most or (rest == 0 and doublings.bit_count() == 1)

    def relative_error_of(self, by_batch: Numbers) -> float | None:
        """Return the relative standard error of the mean over batches; None where it is unknown."""
        if len(by_batch) < 2 or not (mean := by_batch.mean()) > 0.0:
            return None
        return float(by_batch.std(ddof=1) / np.sqrt(len(by_batch)) / mean)

    def is_met(self, by_batch: Numbers) -> bool:
        """Whether the mean is known well enough."""
        error = self.relative_error_of(by_batch)
        return error is not None and error <= self.relative_error


def make_stop_rule(spec: RunSpec, scene: Scene, buffers: BufferLayout) -> StopRule | None:
    """Return the run file's stop rule; None where it has none.

    Raises
    ------
    InputError
        The variable, release or line is none of this run's, the region does not fit the variable, or holds no cell.
    """
    stop = spec.ensemble.stop
    if stop is None:
        return None
    row = _variable(spec, scene, stop)
    region = stop.region
    _check_keys(spec, region, row)
    # A buffer that holds its own indices: what product_fields makes of it says where the variable's numbers stand.
    indices = tally_views(buffers, np.arange(buffers.size, dtype=np.float64))
    fields = product_fields(indices, scene.grid, scene.planes, 1.0)
    places = next(field.values for field in fields if field.name == row.name)
    masks = [_mask(spec, scene, region, axis, row) for axis in row.dimensions if axis != RELEASE]
    chosen = places[np.ix_(*masks)].astype(np.int64).ravel()
    if not chosen.size:
        raise refuse(spec, "ensemble.stop.region", None, "holds the middle of no cell; widen it")
    release = None
    if region.release is not None:
        release = _place_of(spec, "release", region.release, [one.name for one in scene.releases])
    return StopRule(chosen, release, stop.relative_error, stop.at_most_batches)


def _variable(spec: RunSpec, scene: Scene, stop: StopTable) -> Variable:
    rows = layout([plane.name for plane in scene.planes], bool(scene.lines))
    cells = (LATITUDE, *(axis for plane in scene.planes for axis in _image_axes(plane.name)))
    known = {name: row for name, row in rows.items() if row.tallied and set(row.dimensions) & set(cells)}
    if scene.desorption is None:
        del known[ADSORBED_COLUMN]
    if stop.variable not in known:
        raise refuse(
            spec, "ensemble.stop.variable", stop.variable, f"is not tallied here; one of {', '.join(known)}"
        )
    return known[stop.variable]


def _image_axes(image: str) -> tuple[str, str]:
    return HORIZONTAL.replace(IMAGE, image), VERTICAL.replace(IMAGE, image)


def _key(axis: str, row: Variable) -> str:
    """Return the region's key for a dimension."""
    if row.image is None:
        return axis
    return {
        HORIZONTAL.replace(IMAGE, row.image): "horizontal",
        VERTICAL.replace(IMAGE, row.image): "vertical",
    }.get(axis, axis)


def _check_keys(spec: RunSpec, region: RegionTable, row: Variable) -> None:
    allowed = [_key(axis, row) for axis in row.dimensions]
    for key, value in region:
        if value is not None and key not in allowed:
            raise refuse(
                spec,
                f"ensemble.stop.region.{key}",
                None,
                f"{row.name} has none; allowed: {', '.join(allowed)}",
            )
    if LINE in allowed and region.line is None:
        raise refuse(
            spec, "ensemble.stop.region.line", None, f"missing; {row.name} has one value for each line"
        )


def _mask(spec: RunSpec, scene: Scene, region: RegionTable, axis: str, row: Variable) -> Mask:
    """Return which positions along a dimension lie in the region."""
    if axis == LINE:
        names = [line.name for line in scene.lines]
        chosen = _place_of(spec, "line", str(region.line), names)
        return np.array([place == chosen for place in range(len(names))])
    key = _key(axis, row)
    at = middles(_edges(scene, axis, row))
    ends = getattr(region, key)
    if ends is None:
        return np.ones(len(at), dtype=bool)
    low, high = (si(end, scene.body.radius) if isinstance(end, Quantity) else end for end in ends)
    if key != LOCAL_TIME and not low < high:
        raise refuse(
            spec, f"ensemble.stop.region.{key}", None, f"must rise, and goes from {low:g} to {high:g} m"
        )
    above, below = at >= low, at <= high
    # A range of local times that falls goes through midnight.
    inside = above & below if low < high else above | below
    return np.array(inside, dtype=np.bool_)


def _edges(scene: Scene, axis: str, row: Variable) -> Numbers:
    grid = scene.grid
    planes: Iterator[tuple[str, Numbers]] = (
        pair
        for plane in scene.planes
        for pair in zip(_image_axes(plane.name), (plane.horizontal_edges, plane.vertical_edges), strict=True)
    )
    known = {ALTITUDE: grid.altitude_edges, LATITUDE: grid.latitude_edges, LOCAL_TIME: grid.local_time_edges}
    return {**known, **dict(planes)}[axis]


def _place_of(spec: RunSpec, key: str, name: str, names: list[str]) -> int:
    if name not in names:
        raise refuse(spec, f"ensemble.stop.region.{key}", name, f"is none of this run's: {', '.join(names)}")
    return names.index(name)
