"""Tallied fields and what is known about them, put together as one labelled Dataset."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.fate import FATE_LABELS
from tracer.product.layout import (
    ALTITUDE,
    BOUNDS,
    EDGE,
    FATE,
    LABELS,
    LATITUDE,
    LAUNCH_SPEED,
    LINE,
    LOCAL_TIME,
    ORDER,
    RELEASE,
    REPLICATE,
    REPLICATES,
    STANDARD_ERROR,
    Variable,
    image_dimensions,
    layout,
    variable_names,
)
from tracer.tally.axes import ORDERS, Grid, ImagePlane, cell_area, cell_volume, middles
from tracer.tally.field import FieldStatistics

Entry = tuple[tuple[str, ...], NDArray[Any], dict[str, Any]]


def assemble(
    grid: Grid,
    planes: Sequence[ImagePlane],
    release_names: Sequence[str],
    fields: Mapping[str, FieldStatistics],
    plain: Mapping[str, NDArray[np.float64]],
    attributes: Mapping[str, Any],
    line_names: Sequence[str] = (),
    launch_speed_edges: NDArray[np.float64] | None = None,
) -> xr.Dataset:
    """Return a product as `open_product` gives it, before it has a file.

    Parameters
    ----------
    grid : Grid
        Cells of the spherical grid.
    planes : sequence of ImagePlane
        One for each image.
    release_names : sequence of str
        Names along the `release` dimension.
    fields : mapping of str to FieldStatistics
        Every tallied variable of `layout(images)` by name, in its unit and dimensions; optional ones may be missing.
    plain : mapping of str to ndarray
        Variables without errors that the grid does not give: `surface_temperature` [K], shape (L, H).
    attributes : mapping
        Global attributes; those that are None are left out.
    line_names : sequence of str
        Names along the `line` dimension; without lines there are no line variables.
    launch_speed_edges : ndarray, optional
        Edges of the bins of launch speed [m s-1]; without them there are no responses.

    Raises
    ------
    ValueError
        Where a variable is missing, unknown or of another shape.
    """
    images = {plane.name: plane for plane in planes}
    speeds = launch_speed_edges is not None
    table = layout(images, bool(line_names), speeds)
    values = {**plain, "cell_volume": cell_volume(grid), "cell_area": cell_area(grid)}
    _check_names(table, fields, values, speeds)
    names = {RELEASE: release_names, FATE: FATE_LABELS, **({LINE: line_names} if line_names else {})}
    coordinates, bounds = _axes(grid, planes, names, launch_speed_edges)
    sizes = {axis: len(entry[1]) for axis, entry in coordinates.items()} | {ORDER: ORDERS}
    sizes |= {dimension: len(labels) for dimension, labels in names.items()}
    variables: dict[str, Entry] = {}
    for name, row in table.items():
        if row.tallied and name in fields:
            variables |= _tallied(row, fields[name], images.get(row.image or ""))
        elif name in values:
            variables[name] = (row.dimensions, values[name], _attributes(row))
    _check_shapes(variables, sizes)
    known = {key: value for key, value in attributes.items() if value is not None}
    return with_label_indexes(xr.Dataset({**variables, **bounds}, coordinates, known))


def with_label_indexes(ds: xr.Dataset) -> xr.Dataset:
    """Return the product with an index over each dimension that has names, for `.sel(fate="escaped")`."""
    present = [label for label in LABELS if label.variable in ds.variables]
    return ds.assign_coords({label.dimension: ds[label.variable].values.astype(object) for label in present})


def without_label_indexes(ds: xr.Dataset) -> xr.Dataset:
    """Return the product without the indexes of `with_label_indexes`, as it goes into the file."""
    present = [label.dimension for label in LABELS if label.variable in ds.variables]
    return ds.drop_vars(present, errors="ignore")


def _axes(
    grid: Grid,
    planes: Sequence[ImagePlane],
    names: Mapping[str, Sequence[str]],
    launch_speed_edges: NDArray[np.float64] | None,
) -> tuple[dict[str, Entry], dict[str, Entry]]:
    edges: dict[str, tuple[NDArray[np.float64], dict[str, Any]]] = {
        ALTITUDE: (
            grid.altitude_edges,
            {**_named("altitude", "m", "altitude"), "axis": "Z", "positive": "up"},
        ),
        LATITUDE: (grid.latitude_edges, {**_named("latitude", "degrees_north", "latitude"), "axis": "Y"}),
        LOCAL_TIME: (grid.local_time_edges, _named("local time, 12 at noon and 18 at dusk", "h")),
    }
    for plane in planes:
        vertical, horizontal = image_dimensions(plane.name)
        edges[vertical] = (
            plane.vertical_edges,
            _named(f"upwards from the body's centre, {plane.title}", "m"),
        )
        edges[horizontal] = (
            plane.horizontal_edges,
            _named(f"rightwards from the body's centre, {plane.title}", "m"),
        )
    if launch_speed_edges is not None:
        edges[LAUNCH_SPEED] = launch_speed_edges, _named("speed of launch relative to the ground", "m s-1")
    coordinates: dict[str, Entry] = {}
    bounds: dict[str, Entry] = {}
    for axis, (ends, attributes) in edges.items():
        coordinates[axis] = ((axis,), middles(ends), {**attributes, "bounds": axis + BOUNDS})
        bounds[axis + BOUNDS] = ((axis, EDGE), np.stack([ends[:-1], ends[1:]], axis=1), {})
    for label in LABELS:
        if label.dimension in names:
            text = np.array(list(names[label.dimension]), dtype=object)
            coordinates[label.variable] = ((label.dimension,), text, {"long_name": label.long_name})
    return coordinates, bounds


def _tallied(row: Variable, field: FieldStatistics, plane: ImagePlane | None) -> dict[str, Entry]:
    error = row.name + STANDARD_ERROR
    attributes = {**_attributes(row), "ancillary_variables": error}
    if plane is not None:
        row = row._replace(long_name=f"{row.long_name}, {plane.title}")
        attributes |= {"long_name": row.long_name, **_directions(plane)}
    entries: dict[str, Entry] = {
        row.name: (row.dimensions, np.asarray(field.mean, np.float64), attributes),
        error: (
            row.dimensions,
            np.asarray(field.standard_error, np.float64),
            _named(f"standard error of {row.long_name}", row.unit),
        ),
    }
    if row.replicated and field.replicates is not None:
        entries[row.name + REPLICATES] = (
            (REPLICATE, *row.dimensions),
            np.asarray(field.replicates, np.float32),
            _named(f"means over groups of batches of {row.long_name}", row.unit),
        )
    return entries


def _attributes(row: Variable) -> dict[str, Any]:
    attributes = _named(row.long_name, row.unit, row.standard_name)
    cells = (ALTITUDE, LATITUDE, LOCAL_TIME, *image_dimensions(row.image or ""))
    averaged = [axis for axis in row.dimensions if axis in cells]
    if row.tallied and averaged:
        attributes["cell_methods"] = " ".join(f"{axis}:" for axis in averaged) + " mean"
    on_the_outer_sphere = row.unit.endswith("sr-1")
    if {LATITUDE, LOCAL_TIME} <= set(row.dimensions) and not on_the_outer_sphere:
        attributes["cell_measures"] = (
            "volume: cell_volume" if ALTITUDE in row.dimensions else "area: cell_area"
        )
    return attributes


def _named(long_name: str, unit: str, standard_name: str | None = None) -> dict[str, Any]:
    attributes = {"long_name": long_name, "units": unit}
    if standard_name is not None:
        attributes["standard_name"] = standard_name
    if unit == "K":
        attributes["units_metadata"] = "temperature: on_scale"
    return attributes


def _directions(plane: ImagePlane) -> dict[str, Any]:
    return {
        "toward_viewer": np.array(plane.toward_viewer),
        "up": np.array(plane.up),
        "right": np.array(plane.right),
    }


def _check_names(
    table: Mapping[str, Variable],
    fields: Mapping[str, FieldStatistics],
    values: Mapping[str, Any],
    speeds: bool,
) -> None:
    names = variable_names({row.image: row for row in table.values() if row.image}, speeds=speeds)
    twice = sorted({name for name in names if names.count(name) > 1})
    if twice:
        raise ValueError(f"images of the product: their names collide in {twice}")
    tallied = {name for name, row in table.items() if row.tallied}
    needed = {name for name, row in table.items() if not row.optional}
    unknown = (fields.keys() - tallied) | (values.keys() - (table.keys() - tallied))
    missing = needed - fields.keys() - values.keys()
    if unknown or missing:
        raise ValueError(f"fields of the product: missing {sorted(missing)}, unknown {sorted(unknown)}")


def _check_shapes(variables: Mapping[str, Entry], sizes: Mapping[str, int]) -> None:
    for name, (dimensions, array, _) in variables.items():
        expected = tuple(sizes[axis] for axis in dimensions if axis != REPLICATE)
        if array.shape[len(dimensions) - len(expected) :] != expected or array.ndim != len(dimensions):
            raise ValueError(f"{name} has shape {array.shape}, its dimensions {dimensions} need {expected}")
