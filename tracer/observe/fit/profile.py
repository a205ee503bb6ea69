"""The measured profile from its table, checked, with its units."""

from typing import Any, NamedTuple

import numpy as np
from astropy.table import Table
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.observe.observationspec.observation import ObservationSpec
from tracer.observe.observationspec.profile import ProfileTable
from tracer.observe.tables import column_values, numbers, read_table
from tracer.units import RADII, conversion_factor, quoted

Floats = NDArray[np.float64]

POSITION_ENDINGS = {"_km": "km", "_m": "m", "_radii": RADII, "_arcsec": "arcsec", "_deg": "deg"}
VALUE_ENDINGS = {"_rayleigh": "R", "_kR": "kR", "_R": "R", "_cm2": "cm-2", "_m2": "m-2"}
"""Units by the ending of a column's name."""

SI_VALUES = {"brightness": "R", "column": "m-2"}
"""Units in which products hold what is measured."""

TRUTHS = {"true": True, "1": True, "1.0": True, "false": False, "0": False, "0.0": False, "": False}
LEAST_POINTS = 2
FAINTEST, BRIGHTEST = 1e-60, 1e60
"""Sizes of values and standard errors, in the product's unit, between which squares of their ratios are numbers."""


class Profile(NamedTuple):
    """N measured points.

    `position` as given, in `position_unit`; `value` and `sigma` in the product's unit, rayleigh or m-2; `upper` (N,)
    marks upper limits; `value_unit` and `value_factor`: the unit as given, and how many of the product's make one.
    """

    position: Floats
    value: Floats
    sigma: Floats
    upper: NDArray[np.bool_]
    position_unit: str
    value_unit: str
    value_factor: float


def read_profile(spec: ObservationSpec) -> Profile:
    """Return the profile that an observation file names.

    Raises
    ------
    InputError
        A file, column or unit that is missing, an entry that is no finite number, a standard error that is not above
        0, positions that turn back, or no point that was measured; with file, row and column.
    """
    name = str(spec.folder / spec.profile.file)
    table = read_table(name)
    try:
        return _profile(table, spec.profile)
    except InputError as error:
        raise InputError(f"{name}: {error}") from None


def _profile(table: Table, given: ProfileTable) -> Profile:
    position, value, sigma = (numbers(table, name) for name in (given.position, given.value, given.sigma))
    _refuse(sigma <= 0.0, sigma, given.sigma, "must be above 0")
    _check_one_way(position, given.position)
    upper = _limits(table, given.upper_limit)
    _refuse(upper & (value <= 0.0), value, given.value, "an upper limit must be above 0")
    if len(position) < LEAST_POINTS:
        raise InputError(f"has {len(position)} row; a fit needs at least {LEAST_POINTS}")
    if upper.all():
        raise InputError(
            f"column {given.upper_limit}: every row is an upper limit; a fit needs rows that were measured. Where "
            "values with standard errors are at hand, give those, even below 0, and leave upper_limit out"
        )
    position_unit = _unit_of(table, given.position, "position", given.position_unit, POSITION_ENDINGS)
    if position_unit != RADII and not any(conversion_factor(position_unit, one) for one in ("m", "deg")):
        raise InputError(
            f"column {given.position}: its unit {quoted(position_unit)} is no unit of length or angle, nor radii"
        )
    unit = _unit_of(table, given.value, "value", given.value_unit, VALUE_ENDINGS)
    factor = _value_factor(unit, given, given.value)
    own = _stated_unit(table, given.sigma, VALUE_ENDINGS)
    sigma_factor = factor if own is None else _value_factor(own, given, given.sigma)
    wanted = SI_VALUES[given.quantity]
    _refuse(
        np.abs(value) > BRIGHTEST / factor,
        value,
        given.value,
        f"must be at most {BRIGHTEST:g} {wanted} in size",
    )
    for bad, words in (
        (sigma > BRIGHTEST / sigma_factor, f"must be at most {BRIGHTEST:g} {wanted} in size"),
        (sigma < FAINTEST / sigma_factor, f"must be at least {FAINTEST:g} {wanted}"),
    ):
        _refuse(bad, sigma, given.sigma, words)
    return Profile(position, value * factor, sigma * sigma_factor, upper, position_unit, unit, factor)


def _refuse(wrong: NDArray[np.bool_], values: Floats, column: str, allowed: str) -> None:
    if wrong.any():
        row = int(np.argmax(wrong))
        raise InputError(f"row {row + 1}, column {column}: {values[row]:g} is not allowed; {allowed}")


def _check_one_way(position: Floats, column: str) -> None:
    steps = np.diff(position)
    back = steps < 0.0 if steps.sum() >= 0.0 else steps > 0.0
    if back.any():
        row = int(np.argmax(back)) + 2
        raise InputError(
            f"row {row}, column {column}: {position[row - 1]:g} turns back behind {position[row - 2]:g}; rows must "
            "rise or fall throughout, so that two profiles in one table, or a lost sign, are noticed: sort them"
        )


def _limits(table: Table, column: str | None) -> NDArray[np.bool_]:
    if column is None:
        return np.zeros(len(table), dtype=bool)
    if column not in table.colnames:
        raise InputError(f"column {column}: missing; the table has {', '.join(table.colnames)}")
    words = [str(entry).strip().lower() for entry in column_values(table[column])]
    for row, word in enumerate(words, 1):
        if word not in TRUTHS:
            raise InputError(
                f"row {row}, column {column}: {quoted(word)} is not allowed; must be true or false"
            )
    return np.array([TRUTHS[word] for word in words])


def _stated_unit(table: Table, column: str, endings: dict[str, str]) -> str | None:
    """Return the unit that a column states itself, by its header in ECSV or the ending of its name."""
    unit: Any = getattr(table[column], "unit", None)
    if unit is not None:
        return str(unit)
    return next((unit for ending, unit in endings.items() if column.endswith(ending)), None)


def _unit_of(table: Table, column: str, key: str, given: str | None, endings: dict[str, str]) -> str:
    stated = _stated_unit(table, column, endings)
    if given is None and stated is None:
        raise InputError(
            f"column {column}: has no unit; name it with profile.{key}_unit, or by an ending of the column's name "
            f"({', '.join(endings)})"
        )
    if given is not None and stated is not None and given != stated:
        same = conversion_factor(given, stated)
        if same is None or abs(same - 1.0) > 1e-9:
            raise InputError(
                f"column {column}: profile.{key}_unit is {quoted(given)}, the column itself says {quoted(stated)}"
            )
    return given if given is not None else str(stated)


def _value_factor(unit: str, given: ProfileTable, column: str) -> float:
    wanted = SI_VALUES[given.quantity]
    factor = conversion_factor(unit, wanted)
    if factor is None:
        examples = "kR or R" if given.quantity == "brightness" else "cm-2 or m-2"
        raise InputError(
            f"column {column}: its unit {quoted(unit)} is none of a {given.quantity}, which is in {examples}"
        )
    return factor
