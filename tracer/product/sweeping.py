"""Points of a sweep put together along the swept dimensions, and taken out again; a chunk at a time."""

import json
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any, NamedTuple

import netCDF4
import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.product.assembling import with_label_indexes, without_label_indexes
from tracer.product.layout import BOUNDS, REPLICATES
from tracer.product.lazy import Key, lazy_variable
from tracer.product.netcdf import small_caches
from tracer.product.reading import open_product
from tracer.product.sweep_layout import (
    DIMENSIONS,
    FIXED,
    POINT,
    POINT_ATTRIBUTES,
    POINT_FIGURES,
    POINT_WORDS,
    SweptAxis,
    number_of,
    shape_of,
    swept_dimensions,
)

ReadPoint = Callable[[int, str, Key], NDArray[Any]]


class PointHead(NamedTuple):
    """A point's product without its values: global attributes, and the shapes of its variables."""

    path: Path
    attributes: dict[str, Any]
    shapes: dict[str, tuple[int, ...]]


def read_head(path: Path) -> PointHead:
    """Return the head of a point's product.

    Raises
    ------
    InputError
        The file cannot be read.
    """
    try:
        with netCDF4.Dataset(path) as file:
            attributes = {key: file.getncattr(key) for key in file.ncattrs()}
            return PointHead(path, attributes, {name: one.shape for name, one in file.variables.items()})
    except (OSError, RuntimeError) as error:
        raise InputError(f"{path}: is damaged and cannot be read ({error})") from None


@contextmanager
def swept_product(
    points: Sequence[PointHead], axes: Sequence[SweptAxis], attributes: Mapping[str, Any]
) -> Iterator[xr.Dataset]:
    """Yield the product of a sweep, lazy: each value is read from its point's file when it is asked for.

    Parameters
    ----------
    points : sequence of PointHead
        Products of the points, of one layout; the last swept dimension runs fastest.
    axes : sequence of SweptAxis
        What varies; their dimensions lead those of a run's variables.
    attributes : mapping
        Global attributes of the sweep.

    Raises
    ------
    InputError
        A point's file is no product, or has other variables or shapes than the first.
    """
    lengths = shape_of(axes)
    for point in points:
        _check_shapes(points[0], point)
    with open_product(points[0].path) as first:
        template = without_label_indexes(first)
        shared = {name: one.load() for name, one in template.variables.items() if _is_shared(name, template)}
        swept = {
            str(name): _Head(one.dims, one.shape, one.dtype, dict(one.attrs))
            for name, one in template.variables.items()
            if name not in shared
        }
        coordinates = {str(name): shared[name] for name in template.coords}
    coordinates |= {axis.variable: _axis_variable(axis) for axis in axes}
    with _Files([point.path for point in points]) as files:
        variables = {str(name): one for name, one in shared.items() if name not in coordinates}
        variables |= {name: _swept(name, one, lengths, files.read) for name, one in swept.items()}
        variables |= _point_variables([point.attributes for point in points], lengths)
        named = {**attributes, DIMENSIONS: " ".join(lengths)}
        yield with_label_indexes(xr.Dataset(variables, coordinates, named))


def sweep_point(sweep: xr.Dataset, number: int) -> xr.Dataset:
    """Return the product of one point of a sweep, as a run of that point's run file alone makes it.

    Parameters
    ----------
    sweep : xarray.Dataset
        As `open_sweep` gives it; it must stay open while the result is read.
    number : int
        The point, counted from 1; the last swept dimension runs fastest.

    Returns
    -------
    xarray.Dataset
        As `open_product` gives it, with the same `data_checksum`; what is not read stays in the file.

    Raises
    ------
    InputError
        There is no such point, or what the sweep says of it is damaged.
    """
    dimensions = swept_dimensions(sweep.attrs)
    lengths = [sweep.sizes[axis] for axis in dimensions]
    points = int(np.prod(lengths))
    if not 1 <= number <= points:
        raise InputError(f"there is no point {number}; there are {points}, counted from 1")
    place = dict(zip(dimensions, map(int, np.unravel_index(number - 1, lengths)), strict=True))
    one = sweep.isel(place)
    try:
        attributes = json.loads(str(one[POINT_ATTRIBUTES].values))
    except (json.JSONDecodeError, RecursionError):
        attributes = None
    if not isinstance(attributes, dict):
        raise InputError(f"what the sweep says of point {number} is damaged")
    others = [str(name) for name in sweep.variables if set(sweep[name].dims) <= set(dimensions)]
    run = one.drop_vars([name for name in others if name in one.variables], errors="ignore")
    run.attrs = {
        key: np.array(value) if isinstance(value, list) else value for key, value in attributes.items()
    }
    return run


class _Head(NamedTuple):
    """A variable without its values."""

    dims: tuple[Any, ...]
    shape: tuple[int, ...]
    dtype: np.dtype[Any]
    attributes: dict[Any, Any]


def _is_shared(name: Any, product: xr.Dataset) -> bool:
    """Return whether a variable is the same for all points."""
    return name in FIXED or name in product.coords or str(name).endswith(BOUNDS)


def _axis_variable(axis: SweptAxis) -> xr.Variable:
    return xr.Variable((axis.dimension,), axis.values, dict(axis.attributes))


def _swept(name: str, one: _Head, lengths: Mapping[str, int], read_point: ReadPoint) -> xr.Variable:
    """Return a variable over the swept dimensions and its own, whose values are read point by point."""
    shape = tuple(lengths.values())
    numbers = np.arange(int(np.prod(shape))).reshape(shape)

    def read(key: Key) -> NDArray[Any]:
        chosen, rest = np.asarray(numbers[key[: len(shape)]]), key[len(shape) :]
        values = [read_point(number, name, rest) for number in chosen.ravel().tolist()]
        return np.stack(values).reshape(*chosen.shape, *values[0].shape)

    return lazy_variable((*lengths, *one.dims), (*shape, *one.shape), one.dtype, read, one.attributes)


def _point_variables(
    notes: Sequence[Mapping[str, Any]], lengths: Mapping[str, int]
) -> dict[str, xr.Variable]:
    shape = tuple(lengths.values())

    def over_points(values: list[Any], kind: Any, **attributes: str) -> xr.Variable:
        return xr.Variable(tuple(lengths), np.array(values, dtype=kind).reshape(shape), attributes)

    whole = [json.dumps({key: _plain(value) for key, value in note.items()}) for note in notes]
    made = {
        POINT_ATTRIBUTES: over_points(
            whole, object, long_name="global attributes of the point's own product, as JSON"
        )
    }
    for attribute, words in POINT_WORDS.items():
        texts = [str(note.get(attribute, "")) for note in notes]
        made[f"{POINT}_{attribute}"] = over_points(texts, object, long_name=words)
    for figure in POINT_FIGURES:
        numbers = [number_of(note.get(figure.attribute)) for note in notes]
        if not np.all(np.isnan(numbers)):
            made[figure.name] = over_points(
                numbers, np.float64, long_name=figure.long_name, units=figure.unit
            )
    return made


def _check_shapes(first: PointHead, point: PointHead) -> None:
    ours, theirs = first.shapes, point.shapes
    odd = sorted(name for name in ours.keys() | theirs.keys() if ours.get(name) != theirs.get(name))
    if odd:
        words = "replicates" if all(name.endswith(REPLICATES) for name in odd) else ", ".join(odd[:3])
        raise InputError(f"{point.path.name}: has another shape than the first point in {words}")


def _plain(value: Any) -> Any:
    if isinstance(value, np.ndarray):
        return value.tolist()
    return value.item() if isinstance(value, np.generic) else value


class _Files:
    """The points' files, of which the last that was used stays open."""

    def __init__(self, paths: Sequence[Path]) -> None:
        self._paths = paths
        self._number = -1
        self._file: Any = None

    def __enter__(self) -> "_Files":
        return self

    def __exit__(self, *_: object) -> None:
        if self._file is not None:
            self._file.close()
            self._file = None

    def read(self, number: int, name: str, key: Key) -> NDArray[Any]:
        """Return values of one variable of the point at `number`, from 0."""
        if self._file is None or number != self._number:
            self.__exit__()
            with small_caches():
                self._file = netCDF4.Dataset(self._paths[number])
            self._file.set_auto_maskandscale(False)
            self._number = number
        return np.asarray(self._file.variables[name][key if key else ...])
