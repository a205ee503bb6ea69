"""Quantities with units as a user writes them, and their values in SI.

Angles are the one exception to SI: the project's words latitude, zenith angle and azimuth are in degrees, so
angles stay in degrees. An energy may be given per mole and is then that of one atom. The extra unit `radii` is
the radius of the body at hand.
"""

import json
import math
import re
import warnings
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from types import MappingProxyType
from typing import Any, NamedTuple

import astropy.units

from tracer.constants import AVOGADRO

RADII = "radii"

KNOWN_UNITS = 256
"""Names of units whose meaning is kept: reading a unit takes as long as all else of a key of a run file."""


class Dimension(NamedTuple):
    """What a unit must measure: its word in messages, the unit of `si`, an example, whether `radii` goes."""

    word: str
    unit: str
    example: str
    radii_allowed: bool = False


DIMENSIONS: Mapping[str, Dimension] = MappingProxyType(
    {
        "length": Dimension("length", "m", "1800 km"),
        "length or radii": Dimension("length", "m", "10 radii", radii_allowed=True),
        "wavelength": Dimension("wavelength", "m", "589.2 nm"),
        "temperature": Dimension("temperature", "K", "1200 K"),
        "speed": Dimension("speed", "m s-1", "2 km/s"),
        "angle": Dimension("angle", "deg", "30 deg"),
        "rate": Dimension("rate", "s-1", "1e24 s-1"),
        "energy": Dimension("energy", "J", "2 eV"),
        "mass": Dimension("mass", "kg", "23 u"),
        "time": Dimension("time", "s", "30 d"),
        "gravitational parameter": Dimension("gravitational parameter", "m3 s-2", "9500 km3 s-2"),
        "acceleration": Dimension("acceleration", "m s-2", "0.05 m s-2"),
        "magnetic field": Dimension("magnetic field", "T", "195 nT"),
        "thermal inertia": Dimension("thermal inertia", "J m-2 K-1 s-1/2", "50 J m-2 K-1 s-1/2"),
        "thermal conductivity": Dimension("thermal conductivity", "W m-1 K-1", "0.01 W m-1 K-1"),
        "mass density": Dimension("mass density", "kg m-3", "1500 kg m-3"),
        "heat capacity": Dimension("specific heat capacity", "J kg-1 K-1", "600 J kg-1 K-1"),
        "number density": Dimension("number density", "m-3", "50 cm-3"),
        "area": Dimension("area", "m2", "20 cm2"),
        "photon flux": Dimension("photon flux", "m-2 s-1", "2e14 cm-2 s-1"),
        "column density": Dimension("column density", "m-2", "1e9 cm-2"),
        "brightness": Dimension("brightness", "R", "5 kR"),
    }
)

_NUMBER = r"[+-]?(?:(?:[0-9]+(?:_[0-9]+)*)(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_QUANTITY = re.compile(
    rf"\s*({_NUMBER}|[+-]?(?:nan|inf(?:inity)?)(?![a-z]))\s*(.*)", re.IGNORECASE | re.DOTALL
)
_SCALED_UNIT = re.compile(r"(?!1\s*/)[0-9.+-]")
"""A unit that begins with a number of its own, such as `3 km`; `1/s` is none."""
_BROKEN_POWER = re.compile(r"(?<=[A-Za-z^])(-?[0-9]+(?:/[0-9]+|\.[0-9]+))")
"""A power such as that of `s-1/2`, which `astropy.units` reads in brackets alone."""

_MOLAR_ENERGY = astropy.units.Unit("J mol-1")
_MOLE = astropy.units.Unit(astropy.units.mol / AVOGADRO)
_PURE = astropy.units.dimensionless_unscaled
_NO_UNIT = ("", "1")
_FILE_WORDS: Mapping[str, str] = MappingProxyType({"kelvin": "K", "kelvins": "K", "percent": "%"})


@dataclass(frozen=True)
class Quantity:
    """A value and the unit it was given in; equal where both are the same, so `1 km` is not `1000 m`."""

    value: float
    unit: str

    def __str__(self) -> str:
        """Text that `parse` turns into this very quantity, for example `1e24 s-1`."""
        return f"{_shortest(self.value)} {self.unit}"


def parse(text: object, dimension: str) -> Quantity:
    """Read a quantity such as `"1200 K"`.

    Parameters
    ----------
    text : str
        A number and a unit, in the notation of `astropy.units`.
    dimension : str
        A key of `DIMENSIONS`.

    Returns
    -------
    Quantity
        Value and unit as written.

    Raises
    ------
    ValueError
        Not a text, no number, no unit, an unknown unit, one of another dimension, or not finite in SI units.
    """
    wanted = DIMENSIONS[dimension]
    hint = f'write for example "{wanted.example}"'
    if not isinstance(text, str):
        missing = "has no unit" if _is_number(text) else f"is not a {wanted.word}"
        raise ValueError(f"{quoted(text)} {missing}; {hint}")
    match = _QUANTITY.fullmatch(text)
    if match is None:
        raise ValueError(f"{quoted(text)} is not a number with a unit; {hint}")
    quantity = Quantity(float(match[1]), " ".join(match[2].split()))
    if not math.isfinite(quantity.value):
        raise ValueError(f"{quoted(text)} is not finite; {hint}")
    if not quantity.unit:
        raise ValueError(f"{quoted(text)} has no unit; {hint}")
    _refuse_unit(quantity.unit, wanted, f"{quoted(text)}: {quoted(quantity.unit)}", hint)
    if quantity.unit != RADII and not math.isfinite(si(quantity)):
        raise ValueError(f"{quoted(text)} is too large to be a number in {wanted.unit}")
    return quantity


def si(quantity: Quantity, radius: float | None = None) -> float:
    """Return the value in SI units, angles in degrees.

    Parameters
    ----------
    quantity : Quantity
        As `parse` returns it.
    radius : float, optional
        The body's radius [m], needed for lengths in `radii`.

    Returns
    -------
    float
        Value in the unit that `DIMENSIONS` names for the quantity's dimension.

    Raises
    ------
    ValueError
        The unit is unknown or of no dimension of the table, or `radii` without a radius.
    """
    if quantity.unit == RADII:
        if radius is None:
            raise ValueError(f"{quantity} is no length before the body's radius is known")
        return quantity.value * radius
    wanted = _unit(si_unit(quantity.unit))
    return float(_unit(quantity.unit).to(wanted, quantity.value))


def si_unit(name: str) -> str:
    """Return the unit in which `si` gives what is measured in the unit `name`.

    Raises
    ------
    ValueError
        As `si`.
    """
    found = _si_unit(DIMENSIONS["length"].unit if name == RADII else name)
    if found is None:
        raise ValueError(f"{quoted(name)} is not a unit of any dimension in use")
    return found


def as_written(text: str) -> Quantity | None:
    """Return the number and the unit of a text, whatever its unit is worth; None where it is no finite number."""
    match = _QUANTITY.fullmatch(text)
    if match is None or not math.isfinite(float(match[1])):
        return None
    return Quantity(float(match[1]), " ".join(match[2].split()))


def conversion_factor(name: str, wanted: str) -> float | None:
    """Return by how much a number in unit `name` is multiplied to be in unit `wanted`, None where it cannot be.

    Beside the notation of `astropy.units` the words that netCDF files use for kelvin and for pure numbers are known.
    Temperatures that count from another zero, such as degrees Celsius, are no multiples of a kelvin.
    """
    given, target = (_file_unit(word.strip()) for word in (name, wanted))
    if given is None or target is None or not given.is_equivalent(target):
        return None
    return float(given.to(target))


def quoted(value: object) -> str:
    """Return `value` as a run file would show it, on one printable line of at most 60 characters."""
    if isinstance(value, Mapping):
        return "a table"
    if isinstance(value, list | tuple) and any(isinstance(entry, Mapping) for entry in value):
        return "a list of tables"
    if isinstance(value, float):
        return float.__repr__(value)
    text = json.dumps(value, ensure_ascii=False, default=str)
    text = "".join(c if c.isprintable() else f"\\u{ord(c):04x}" for c in text)
    return text if len(text) <= 60 else f"{text[:57]}..."


def _refuse_unit(name: str, wanted: Dimension, subject: str, hint: str) -> None:
    if name == RADII:
        if not wanted.radii_allowed:
            raise ValueError(f"{subject} is not allowed here; {hint}")
        return
    unit = _unit(name)
    if unit is None:
        raise ValueError(f"{subject} is not a known unit; {hint}")
    if not unit.is_equivalent(_unit(wanted.unit)):
        raise ValueError(f"{subject} is not a unit of {wanted.word}; {hint}")


@lru_cache(KNOWN_UNITS)
def _si_unit(name: str) -> str | None:
    unit = _unit(name)
    if unit is None:
        return None
    return next((one.unit for one in DIMENSIONS.values() if unit.is_equivalent(_unit(one.unit))), None)


@lru_cache(KNOWN_UNITS)
def _unit(name: str) -> Any:
    """Return the astropy unit called `name`, or None where there is none."""
    if _SCALED_UNIT.match(name):
        return None
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        try:
            unit = astropy.units.Unit(_BROKEN_POWER.sub(r"(\1)", name))
        except (ValueError, TypeError, ArithmeticError):
            return None
    # Logarithmic and structured units are no factors, so they have no SI value by multiplication.
    if not isinstance(unit, astropy.units.UnitBase):
        return None
    return unit * _MOLE if unit.is_equivalent(_MOLAR_ENERGY) else unit


def _file_unit(name: str) -> Any:
    return _PURE if name in _NO_UNIT else _unit(_FILE_WORDS.get(name, name))


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def _shortest(value: float) -> str:
    text = repr(float(value)).removesuffix(".0")
    return re.sub(r"e\+?(-?)0*", r"e\1", text)
