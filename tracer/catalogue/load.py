"""Read the package's data files into records.

The files are comma separated, UTF-8; lines that begin with `#` carry the sources.
"""

import csv
from collections.abc import Mapping
from functools import cache
from importlib.resources import files
from types import MappingProxyType

from tracer.catalogue.records import Body, Gas, Host, Orbit
from tracer.constants import ASTRONOMICAL_UNIT, ATOMIC_MASS

DAY = 86400.0
KILOMETRE = 1e3
NANOTESLA = 1e-9
_LENGTH_UNITS = {"au": ASTRONOMICAL_UNIT, "km": KILOMETRE}


@cache
def bodies() -> Mapping[str, Body]:
    """Return the airless bodies by name."""
    return MappingProxyType({row["body"]: _body(row) for row in rows("bodies.csv")})


@cache
def hosts() -> Mapping[str, Host]:
    """Return the Sun and the planets that hold moons of the catalogue, by name."""
    return MappingProxyType({row["host"]: _host(row) for row in rows("hosts.csv")})


@cache
def gases() -> Mapping[str, Gas]:
    """Return the gases by chemical formula."""
    return MappingProxyType(
        {
            row["species"]: Gas(row["species"], float(row["mass_u"]) * ATOMIC_MASS, row["description"])
            for row in rows("gases.csv")
        }
    )


def source_notes(name: str) -> str:
    """Return the comment lines of data file `name`, which say where its values come from."""
    lines = _text(name).splitlines()
    return "\n".join(line.lstrip("# ") for line in lines if line.startswith("#"))


def _text(name: str) -> str:
    return (files("tracer.catalogue") / "data" / name).read_text(encoding="utf-8")


def rows(name: str) -> list[dict[str, str]]:
    lines = (line for line in _text(name).splitlines() if line and not line.startswith("#"))
    return list(csv.DictReader(lines))


def _host(row: dict[str, str]) -> Host:
    orbit = None
    if row["semi_major_axis_au"]:
        orbit = Orbit(float(row["semi_major_axis_au"]) * ASTRONOMICAL_UNIT, float(row["eccentricity"]))
    return Host(
        row["host"], float(row["gm_km3_s2"]) * KILOMETRE**3, float(row["mean_radius_km"]) * KILOMETRE, orbit
    )


def _body(row: dict[str, str]) -> Body:
    return Body(
        name=row["body"],
        host=hosts()[row["host"]],
        gm=float(row["gm_km3_s2"]) * KILOMETRE**3,
        radius=float(row["mean_radius_km"]) * KILOMETRE,
        rotation_period=float(row["sidereal_rotation_d"]) * DAY,
        orbit=Orbit(
            float(row["semi_major_axis"]) * _LENGTH_UNITS[row["semi_major_axis_unit"]],
            float(row["eccentricity"]),
        ),
        bond_albedo=float(row["bond_albedo"]),
        emissivity=float(row["emissivity"]),
        equatorial_field=float(row["equatorial_field_nT"]) * NANOTESLA,
    )
