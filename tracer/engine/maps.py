"""Read maps of the surface over latitude and local time from netCDF files."""

import difflib
from collections.abc import Sequence
from pathlib import Path
from typing import Any, NamedTuple

import netCDF4
import numpy as np
from numpy.typing import NDArray

from tracer.engine.refusal import refuse
from tracer.engine.runspec.run import RunSpec
from tracer.errors import InputError
from tracer.inputs.interval import Interval
from tracer.inputs.number import MOST_CELLS
from tracer.kernels.surface_map import SurfaceMap
from tracer.units import conversion_factor, quoted

Floats = NDArray[np.float64]

LATITUDE, LOCAL_TIME = "latitude", "local_time"
DEGREES = ("deg", "degree", "degrees", "degree_north", "degrees_north", "degree_n", "degrees_n")
HOURS = ("h", "hr", "hour", "hours")
HOURS_A_TURN = 24.0
SLACK = 1e-3
"""Part of a cell by which coordinates, which files keep in single precision too, may miss a pole or a full turn."""


class MapKind(NamedTuple):
    """What a map holds: a `word` for messages, the `unit` of its numbers, the range they must lie in.

    `unit` None stands for relative numbers, whose unit does not count; `"1"` for pure numbers.
    """

    word: str
    unit: str | None
    interval: Interval


TEMPERATURE_MAP = MapKind("temperature", "K", Interval(above=0.0))
PROBABILITY_MAP = MapKind("probability", "1", Interval(at_least=0.0, at_most=1.0))
FLUX_MAP = MapKind("relative flux", None, Interval(at_least=0.0))


def read_map(spec: RunSpec, key: str, file: str, variable: str, kind: MapKind) -> SurfaceMap:
    """Return a map whose coordinates are the middles of cells that cover the sphere.

    Parameters
    ----------
    spec : RunSpec
        The run file, in whose folder relative paths begin.
    key : str
        Path of the table that holds the keys `file` and `variable`, for messages.
    file, variable : str
        A netCDF file, and its variable over the dimensions `latitude` [deg] and `local_time` [h], in any order and
        direction, each with a coordinate of its name.
    kind : MapKind
        What the variable must hold.

    Raises
    ------
    InputError
        The file cannot be read; the variable is missing, has other dimensions, another unit, a hole or a value out of
        range; its cells leave a part of the sphere uncovered.
    """
    path = spec.folder / file
    if reason := _why_no_file(path):
        raise refuse(spec, f"{key}.file", file, reason)
    try:
        with netCDF4.Dataset(str(path)) as dataset:
            return _read(dataset, variable, kind)
    except InputError as error:
        raise refuse(spec, f"{key}.variable", variable, f"of {file}: {error}") from None
    except (OSError, RuntimeError, ValueError, TypeError, AttributeError, IndexError) as error:
        reason = str(getattr(error, "strerror", None) or error or type(error).__name__).splitlines()[0]
        raise refuse(spec, f"{key}.file", file, f"cannot be read as netCDF: {reason}") from None


def _why_no_file(path: Path) -> str | None:
    try:
        with path.open("rb"):
            return None
    except IsADirectoryError:
        return "is a folder; must be a netCDF file"
    except FileNotFoundError:
        return f"no such file in {path.parent}"
    except (OSError, ValueError) as error:
        return f"cannot be read: {getattr(error, 'strerror', None) or error}"


def _read(dataset: Any, variable: str, kind: MapKind) -> SurfaceMap:
    names = [str(name) for name in dataset.variables]
    if variable not in names:
        raise InputError(f"is not in the file; {_offer(variable, names)}")
    found = dataset.variables[variable]
    if set(found.dimensions) != {LATITUDE, LOCAL_TIME} or len(found.dimensions) != 2:
        over = f"({', '.join(found.dimensions)})" if found.dimensions else "no dimension"
        raise InputError(f"lies over {over}; must lie over ({LATITUDE}, {LOCAL_TIME})")
    latitudes = _axis(dataset, LATITUDE, DEGREES, "deg", Interval(at_least=-90.0, at_most=90.0))
    local_times = _axis(dataset, LOCAL_TIME, HOURS, "h", Interval(at_least=0.0, at_most=HOURS_A_TURN))
    values = _numbers(found, variable) * _unit_factor(found, kind)
    if found.dimensions[0] == LOCAL_TIME:
        values = values.T
    values = values[:: _way(latitudes, LATITUDE), :: _way(local_times, LOCAL_TIME)]
    latitudes, local_times = np.sort(latitudes), np.sort(local_times)
    _refuse_gap_at_poles(latitudes)
    _refuse_gap_in_turn(local_times)
    _refuse_values(latitudes, local_times, values, kind)
    return SurfaceMap(latitudes, local_times, np.ascontiguousarray(values))


def _offer(wanted: str, names: Sequence[str]) -> str:
    close = difflib.get_close_matches(wanted, names, n=1, cutoff=0.6)
    others = [name for name in names if name not in (LATITUDE, LOCAL_TIME)]
    if close:
        return f"did you mean {close[0]}?"
    return f"it holds {', '.join(others[:8])}" if others else "it holds no variable but coordinates"


def _axis(dataset: Any, name: str, units: Sequence[str], unit: str, interval: Interval) -> Floats:
    if name not in dataset.variables or dataset.variables[name].dimensions != (name,):
        raise InputError(f"needs the coordinate {name}({name}), the middles of its cells [{unit}]")
    coordinate = dataset.variables[name]
    given = getattr(coordinate, "units", unit)
    if str(given).strip().lower() not in units:
        raise InputError(f"{name} is in {quoted(given)}; must be in {unit}")
    length = len(dataset.dimensions[name])
    if not 2 <= length <= MOST_CELLS:
        raise InputError(f"{name} has {length} entries; must have from 2 to {MOST_CELLS}")
    numbers = _numbers(coordinate, name)
    for i, number in enumerate(numbers):
        if not interval.holds(float(number)):
            raise InputError(f"{name}[{i}] is {number:g}; must be {interval.words(unit)}")
    return numbers


def _numbers(variable: Any, name: str) -> Floats:
    """Return a variable's numbers with its scale and offset applied; what is marked as missing becomes NaN."""
    if variable.dtype is str or getattr(variable.dtype, "kind", "") not in "fiu":
        raise InputError(f"{name} does not hold numbers")
    masked = np.ma.asarray(variable[...], dtype=np.float64)
    return np.asarray(masked.filled(np.nan))


def _unit_factor(variable: Any, kind: MapKind) -> float:
    """Return by how much the variable's numbers are multiplied to be in the unit of `kind`."""
    if kind.unit is None:
        return 1.0
    if not hasattr(variable, "units"):
        if kind.unit == "1":
            return 1.0
        raise InputError(f"has no attribute units; a {kind.word} must say that it is in {kind.unit}")
    given = str(variable.units)
    factor = conversion_factor(given, kind.unit)
    if factor is None:
        wanted = "a pure number" if kind.unit == "1" else f"in {kind.unit}"
        raise InputError(f"is in {quoted(given)}; a {kind.word} must be {wanted}")
    return factor


def _way(axis: Floats, name: str) -> int:
    """Return 1 for a rising axis and -1 for a falling one."""
    way = 1 if axis[0] < axis[-1] else -1
    for i in range(1, len(axis)):
        if not way * (axis[i] - axis[i - 1]) > 0.0:
            raise InputError(
                f"{name} goes from {axis[i - 1]:g} to {axis[i]:g} at entry {i}; must rise or fall all along"
            )
    return way


def _refuse_gap_at_poles(latitudes: Floats) -> None:
    """Refuse latitudes whose outer cells, as wide as their neighbours, end before the poles."""
    for pole, last, step in (
        (-90.0, latitudes[0], latitudes[1] - latitudes[0]),
        (90.0, latitudes[-1], latitudes[-1] - latitudes[-2]),
    ):
        if abs(pole - last) > (0.5 + SLACK) * step:
            edge = last + np.sign(pole) * 0.5 * step
            raise InputError(
                f"does not cover the sphere: the cell at latitude {last:g} deg ends at {edge:g} deg; cells must reach "
                f"{pole:g} deg"
            )


def _refuse_gap_in_turn(local_times: Floats) -> None:
    """Refuse local times that leave a part of the day out, or that name midnight twice."""
    gap = local_times[0] + HOURS_A_TURN - local_times[-1]
    step = max(local_times[1] - local_times[0], local_times[-1] - local_times[-2])
    if gap <= 0.0:
        raise InputError("has local times 0 and 24 h, which are one; leave out one of them")
    if gap > (1.0 + SLACK) * step:
        raise InputError(
            f"does not cover the sphere: from local time {local_times[-1]:g} h round to {local_times[0]:g} h are "
            f"{gap:g} h, more than a cell of {step:g} h; cells must cover 24 h"
        )


def _refuse_values(latitudes: Floats, local_times: Floats, values: Floats, kind: MapKind) -> None:
    unit = "" if kind.unit in (None, "1") else f" {kind.unit}"
    for bad, what in (
        (~np.isfinite(values), "a hole"),
        (_outside(values, kind.interval), ""),
    ):
        if not bad.any():
            continue
        i, j = (int(place) for place in np.argwhere(bad)[0])
        more = int(bad.sum()) - 1
        others = f" (and {more} more cell{'s' if more > 1 else ''})" if more else ""
        shown = what or f"{values[i, j]:g}{unit}"
        allowed = f"a {kind.word} must be {kind.interval.words(unit.strip())}"
        raise InputError(
            f"{shown} at latitude {latitudes[i]:g} deg, local time {local_times[j]:g} h{others}; {allowed}"
        )


def _outside(values: Floats, interval: Interval) -> NDArray[np.bool_]:
    bad = np.zeros(values.shape, dtype=bool)
    if interval.above is not None:
        bad |= values <= interval.above
    if interval.at_least is not None:
        bad |= values < interval.at_least
    if interval.at_most is not None:
        bad |= values > interval.at_most
    return bad
