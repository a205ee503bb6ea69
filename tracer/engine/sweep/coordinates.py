"""Values of the axes as the product has them: numbers in SI units where all are such, words otherwise."""

from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np
from pydantic import BaseModel

from tracer.engine.runspec.load import SWEEP
from tracer.engine.runspec.overrides import Steps
from tracer.engine.runspec.run import RunSpec
from tracer.engine.sweep.points import Axis, Point, Sweep
from tracer.errors import InputError
from tracer.product.sweep_layout import POINT, SweptAxis
from tracer.units import Quantity, si, si_unit

DEGREE, HOUR, KELVIN = "degree", "h", "K"


class Measure(NamedTuple):
    """A value of an axis as a number in SI units; without a unit where it has none."""

    number: float
    unit: str
    written_unit: str


def swept_axes(sweep: Sweep, points: Sequence[Point], radii: Sequence[float]) -> tuple[SweptAxis, ...]:
    """Return the axes with their values in SI units.

    Parameters
    ----------
    sweep : Sweep
        The sweep.
    points : sequence of Point
        All its points.
    radii : sequence of float
        Radius of each point's body [m].

    Raises
    ------
    InputError
        A value twice, or numbers along a dimension of their own that neither rise nor fall throughout.
    """
    return tuple(_swept_axis(sweep, number, points, radii) for number in range(len(sweep.axes)))


def _swept_axis(sweep: Sweep, number: int, points: Sequence[Point], radii: Sequence[float]) -> SweptAxis:
    axis = sweep.axes[number]
    subject = f"{sweep.file}: {SWEEP}.axis[{number + 1}].values"
    dimension = POINT if sweep.paired else axis.name
    firsts = [next(point for point in points if point.places[number] == i) for i in range(len(axis.values))]
    found = [_measure(axis, point, radii[point.number - 1]) for point in firsts]
    measures = [one for one in found if one is not None]
    notes = {"long_name": axis.name.replace("_", " "), "run_file_key": axis.key}
    if len(measures) < len(found) or len({one.unit for one in measures}) > 1:
        words = np.array(axis.words, dtype=object)
        if not sweep.paired:
            _refuse_twice(subject, axis.words, axis.words)
        return SweptAxis(axis.name, dimension, words, notes)
    values = np.array([one.number for one in measures])
    if not sweep.paired:
        _refuse_twice(subject, values.tolist(), axis.words)
        _refuse_back_and_forth(subject, axis, values)
    unit, written = measures[0].unit, measures[0].written_unit
    if "/" in unit:
        # The conventions of netCDF files know no broken powers.
        return SweptAxis(
            axis.name, dimension, values, {**notes, "long_name": f"{notes['long_name']} [{unit}]"}
        )
    notes |= {"units": unit or "1", **({"written_unit": written} if written else {})}
    if unit == KELVIN:
        notes["units_metadata"] = "temperature: on_scale"
    return SweptAxis(axis.name, dimension, values, notes)


def _measure(axis: Axis, point: Point, radius: float) -> Measure | None:
    """Return an axis' value at a point as a number; None where it is a word, a table or a list."""
    value = None if axis.labelled else _value_at(point.spec, axis.steps)
    if isinstance(value, Quantity):
        unit = si_unit(value.unit)
        return Measure(si(value, radius), DEGREE if unit == "deg" else unit, value.unit)
    if isinstance(value, bool) or not isinstance(value, int | float):
        return None
    return Measure(float(value), HOUR if axis.steps[-1][0] == "local_time" else "", "")


def _value_at(spec: RunSpec, steps: Steps) -> Any:
    value: Any = spec
    for key, number in steps:
        value = getattr(value, key, None) if isinstance(value, BaseModel) else None
        if number is not None:
            value = value[number - 1] if isinstance(value, tuple) and number <= len(value) else None
    return value


def _refuse_twice(subject: str, values: Sequence[Any], words: Sequence[str]) -> None:
    for i, value in enumerate(values):
        if value in values[:i]:
            first = words[values.index(value)]
            same = "stands there twice" if words[i] == first else f'is the same as "{first}"'
            raise InputError(f'{subject}: "{words[i]}" {same}; each value is traced once')


def _refuse_back_and_forth(subject: str, axis: Axis, values: np.ndarray[Any, Any]) -> None:
    steps = np.diff(values)
    if not (np.all(steps > 0.0) or np.all(steps < 0.0)):
        turn = int(np.flatnonzero(np.sign(steps) != np.sign(steps[0]))[0]) + 1
        raise InputError(
            f'{subject}: turn back at "{axis.words[turn]}"; numbers along an axis must rise or fall throughout'
        )
