"""A sweep file as a whole: its axes with their values, and the run of each point."""

import os
from collections.abc import Iterable, Iterator, Mapping
from math import prod
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import tomli_w
from pydantic import ValidationError

from tracer.engine.runspec.load import SWEEP, checked_run
from tracer.engine.runspec.overrides import Steps, key_steps, override, with_value
from tracer.engine.runspec.run import RunSpec
from tracer.engine.sweep.spacing import spaced
from tracer.engine.sweep.table import AxisTable, SweepFile, SweepTable
from tracer.errors import InputError
from tracer.inputs.messages import validation_message
from tracer.inputs.toml import file_text, tables
from tracer.product.layout import variable_names
from tracer.product.sweep_layout import POINT, reserved_names

MOST_POINTS = 4096
"""More would be refused by nothing but patience: each is checked before the first is traced."""


class Axis(NamedTuple):
    """What varies along one axis: the key as written and in steps, its values as TOML has them, and their names."""

    name: str
    key: str
    steps: Steps
    values: tuple[Any, ...]
    words: tuple[str, ...]
    labelled: bool


class Sweep(NamedTuple):
    """A sweep file read and checked as far as it goes without its points.

    `base` holds the tables of the run file that all points share, `run_file` its name; `paired` says that the values
    of all axes go together.
    """

    file: str
    run_file: str
    base: dict[str, Any]
    table: SweepTable
    axes: tuple[Axis, ...]

    @property
    def paired(self) -> bool:
        """Whether the values of all axes go together along one dimension."""
        return self.table.combine == "paired"

    @property
    def shape(self) -> tuple[int, ...]:
        """Number of values along each swept dimension."""
        lengths = tuple(len(axis.values) for axis in self.axes)
        return lengths[:1] if self.paired else lengths

    @property
    def title(self) -> str:
        """Title of the run file."""
        return str(self.base.get("title", ""))

    @property
    def text(self) -> str:
        """The sweep file with the run file that it names in it, as TOML."""
        table = self.table.model_dump(exclude_unset=True, exclude={"run"})
        return tomli_w.dumps({**self.base, SWEEP: table})

    def __len__(self) -> int:
        """Return the number of points."""
        return prod(self.shape)


class Point(NamedTuple):
    """One point: its number from 1, the number of its value along each axis from 0, and its run."""

    number: int
    places: tuple[int, ...]
    words: str
    """What varies, with its values, in words."""
    settings: tuple[str, ...]
    """What `tracer run --set` would be told."""
    spec: RunSpec


def load_sweep(path: str | os.PathLike[str], overrides: Iterable[str] = ()) -> Sweep:
    """Read a sweep file.

    Parameters
    ----------
    path : path
        A TOML file: a run file with a table `[sweep]`, or such a table that names a run file.
    overrides : iterable of str
        Changes such as `ensemble.batches=5`, applied to the run file of all points before axes are.

    Returns
    -------
    Sweep
        The axes with their values; the points themselves are checked by `sweep_points`.

    Raises
    ------
    InputError
        The file cannot be read or used; the message says file, key, value and what is allowed.
    """
    name = os.fspath(path)
    given = tables(file_text(name, "sweep file"), name)
    if SWEEP not in given:
        raise InputError(
            f"{name}: {SWEEP}: missing; a sweep file is a run file with a table [{SWEEP}] that says what varies"
        )
    try:
        table = SweepFile.model_validate({SWEEP: given[SWEEP]}, context={"file": name}).sweep
    except ValidationError as error:
        raise InputError(f"{name}: {validation_message(error, SweepFile, given)}") from None
    base = {key: value for key, value in given.items() if key != SWEEP}
    run_file = name
    if table.run is not None:
        run_file = _beside(name, table.run)
        base = _merged(tables(file_text(run_file, "run file"), run_file), base)
        if SWEEP in base:
            raise InputError(f"{name}: {SWEEP}.run: {table.run} is a sweep file itself; must be a run file")
    for change in overrides:
        base = override(base, change)
    axes = tuple(_axis(f"{name}: {SWEEP}.axis[{i}]", entry) for i, entry in enumerate(table.axis, 1))
    sweep = Sweep(name, run_file, base, table, axes)
    _check_axes(sweep)
    return sweep


def sweep_points(sweep: Sweep) -> Iterator[Point]:
    """Yield the points of a sweep, the last axis fastest.

    Raises
    ------
    InputError
        A point's run file cannot be used; the message says which point.
    """
    for index, place in enumerate(np.ndindex(sweep.shape)):
        places = place * len(sweep.axes) if sweep.paired else place
        given = sweep.base
        for number, (axis, i) in enumerate(zip(sweep.axes, places, strict=True), 1):
            subject = f"{sweep.file}: {SWEEP}.axis[{number}].key: {axis.key}"
            given = with_value(given, axis.steps, axis.values[i], subject)
        chosen = [(axis, i) for axis, i in zip(sweep.axes, places, strict=True)]
        words = ", ".join(f"{axis.name} {axis.words[i]}" for axis, i in chosen)
        settings = tuple(f"{axis.key}={_setting(axis.values[i])}" for axis, i in chosen)
        try:
            spec = checked_run(given, sweep.run_file)
        except InputError as error:
            raise about_point(sweep, index + 1, words, error) from None
        yield Point(index + 1, tuple(places), words, settings, spec)


def about_point(sweep: Sweep, number: int, words: str, error: InputError) -> InputError:
    """Return an error about a point's run file as one that says which point of which sweep it is about."""
    reason = str(error).removeprefix(f"{sweep.run_file}: ")
    return InputError(f"{sweep.file}: point {number} ({words}): {reason}")


def _beside(name: str, other: str) -> str:
    """Return the path of a file that is named relative to the file `name`."""
    return os.fspath(Path(name).parent / other)


def _merged(tables_below: dict[str, Any], above: Mapping[str, Any]) -> dict[str, Any]:
    """Return tables with those above them: key by key, lists and values as wholes."""
    merged = dict(tables_below)
    for key, value in above.items():
        below = merged.get(key)
        merged[key] = _merged(below, value) if isinstance(below, dict) and isinstance(value, dict) else value
    return merged


def _axis(subject: str, entry: AxisTable) -> Axis:
    steps = key_steps(entry.key, f"{subject}.key")
    values = entry.values
    if values is None:
        assert entry.first is not None
        assert entry.last is not None
        assert entry.count is not None
        if entry.count > MOST_POINTS:
            raise InputError(f"{subject}.count: {entry.count} is out of range; must be at most {MOST_POINTS}")
        values = spaced(entry.first, entry.last, entry.count, entry.spacing, subject)
    words = entry.labels or tuple(
        _value_words(value, f"{subject}.values[{i}]") for i, value in enumerate(values, 1)
    )
    for i, word in enumerate(words):
        if word in words[:i] and entry.labels is not None:
            raise InputError(f'{subject}.labels: "{word}" stands there twice')
    return Axis(entry.name or steps[-1][0].lower(), entry.key, steps, values, words, entry.labels is not None)


def _value_words(value: Any, subject: str) -> str:
    if isinstance(value, dict | list):
        kind = "table" if isinstance(value, dict) else "list"
        raise InputError(f"{subject}: is a {kind}, which has no name of its own; the axis needs labels")
    return str(value).lower() if isinstance(value, bool) else str(value)


def _setting(value: Any) -> str:
    """Return a value as --set takes it."""
    if isinstance(value, str):
        return value
    return tomli_w.dumps({"x": [value]}).split("=", 1)[1].strip()[1:-1].strip().rstrip(",")


def _check_axes(sweep: Sweep) -> None:
    subject = f"{sweep.file}: {SWEEP}"
    taken = reserved_names() | set(variable_names())
    for number, axis in enumerate(sweep.axes, 1):
        key = f"{subject}.axis[{number}]"
        if axis.name in taken or axis.name.startswith(f"{POINT}_"):
            raise InputError(
                f'{key}.name: "{axis.name}" is taken by the product or another axis; give the axis another name'
            )
        taken |= {axis.name, f"{axis.name}_name"}
        for other, before in enumerate(sweep.axes[: number - 1], 1):
            shorter = min(len(axis.steps), len(before.steps))
            if axis.steps[:shorter] == before.steps[:shorter]:
                raise InputError(
                    f'{key}.key: "{axis.key}" is varied by axis[{other}] already, "{before.key}"'
                )
    lengths = [len(axis.values) for axis in sweep.axes]
    if sweep.paired and len(set(lengths)) > 1:
        each = ", ".join(f"{axis.name} {len(axis.values)}" for axis in sweep.axes)
        raise InputError(f'{subject}.combine: "paired" axes need as many values each; there are {each}')
    if len(sweep) > MOST_POINTS:
        raise InputError(
            f"{subject}: {' x '.join(map(str, sweep.shape))} are {len(sweep)} points; at most {MOST_POINTS} are allowed"
        )
