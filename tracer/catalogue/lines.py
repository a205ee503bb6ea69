"""Resonance lines, the solar flux around them and their g-values.

`lines.csv` names the lines; `solar_residual_flux.csv` and `g_values_1au.csv` hold one column a line.
"""

from collections.abc import Mapping
from functools import cache
from types import MappingProxyType

from tracer.catalogue.light_records import GTable, Line, ResidualFlux
from tracer.catalogue.load import rows

ANGSTROM = 1e-10
KILOMETRE_PER_SECOND = 1e3


@cache
def lines() -> Mapping[str, Line]:
    """Return the resonance lines by name."""
    return MappingProxyType({row["line"]: _line(row) for row in rows("lines.csv")})


def lines_of(species: str) -> tuple[Line, ...]:
    """Return the lines of `species`, in the order of the data file; empty where the catalogue has none."""
    return tuple(line for line in lines().values() if line.species == species)


def _line(row: dict[str, str]) -> Line:
    name = row["line"]
    air = row["wavelength_air_angstrom"]
    continuum = row["continuum_g_per_s_1au"]
    return Line(
        name=name,
        species=row["species"],
        wavelength=float(row["wavelength_vacuum_angstrom"]) * ANGSTROM,
        wavelength_air=float(air) * ANGSTROM if air else None,
        oscillator_strength=float(row["oscillator_strength"]),
        continuum_g=float(continuum) if continuum else None,
        residual_flux=_residual_flux(name),
        g=_g_table(name),
    )


def _residual_flux(name: str) -> ResidualFlux | None:
    columns = _columns("solar_residual_flux.csv")
    if name not in columns:
        return None
    offsets = tuple(value * ANGSTROM for value in columns["offset_angstrom"])
    return ResidualFlux(offsets, columns[name])


def _g_table(name: str) -> GTable | None:
    columns = _columns("g_values_1au.csv")
    if name not in columns:
        return None
    velocities = tuple(value * KILOMETRE_PER_SECOND for value in columns["radial_velocity_km_s"])
    return GTable(velocities, columns[name])


@cache
def _columns(file: str) -> Mapping[str, tuple[float, ...]]:
    table = rows(file)
    return MappingProxyType({name: tuple(float(row[name]) for row in table) for name in table[0]})
