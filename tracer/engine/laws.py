"""From the run file's law tables to the laws of physics, one line a law."""

from collections.abc import Callable, Mapping
from types import MappingProxyType
from typing import Any

import numpy as np

from tracer.engine.maps import FLUX_MAP, read_map
from tracer.engine.refusal import refuse
from tracer.engine.runspec import direction as direction_tables
from tracer.engine.runspec import place as place_tables
from tracer.engine.runspec import speed as speed_tables
from tracer.engine.runspec.run import RunSpec
from tracer.engine.speed_table import read_speed_table
from tracer.errors import InputError
from tracer.inputs.sky import SkyPoint
from tracer.physics.release.direction.cosine import Cosine
from tracer.physics.release.direction.isotropic import Isotropic
from tracer.physics.release.direction.normal import Normal
from tracer.physics.release.laws import DirectionLaw, PlaceLaw, SpeedLaw
from tracer.physics.release.place.band import Band
from tracer.physics.release.place.cosine_power import CosinePower
from tracer.physics.release.place.flux_map import FluxMap, flux_map
from tracer.physics.release.place.patch import Patch
from tracer.physics.release.place.uniform import Uniform
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.physics.release.speed.maxwell_gas import MaxwellGas
from tracer.physics.release.speed.sigmund_thompson import SigmundThompson
from tracer.physics.release.speed.single import Single
from tracer.physics.release.speed.table import Table
from tracer.tally.axes import direction
from tracer.units import Quantity, si

TOWARD = MappingProxyType({"sun": (1.0, 0.0, 0.0), "dawn": (0.0, -1.0, 0.0)})
"""Unit vectors of the words for directions; dawn is the leading side of a prograde orbit."""


def speed_law(spec: RunSpec, key: str, table: speed_tables.SpeedLaw) -> SpeedLaw:
    """Return the speed law of a `speed` table; `key` is its path, for messages about its file."""
    return _SPEED[type(table)](spec, key, table)


def direction_law(table: direction_tables.DirectionLaw) -> DirectionLaw:
    """Return the direction law of a `direction` table."""
    return _DIRECTION[type(table)](table)


def place_law(spec: RunSpec, key: str, table: place_tables.PlaceLaw, radius: float) -> PlaceLaw:
    """Return the place law of a `place` table on a body of `radius` [m]; `key` is its path, for messages."""
    return _PLACE[type(table)](spec, key, table, radius)


def _kelvin(temperature: Quantity | str) -> float | None:
    return None if isinstance(temperature, str) else si(temperature)


def _patch(spec: RunSpec, key: str, table: place_tables.Patch, radius: float) -> Patch:
    angle = si(table.radius, radius) / radius
    if angle > np.pi:
        raise refuse(
            spec, f"{key}.radius", table.radius, f"must not reach beyond the antipode, {np.pi * radius:g} m"
        )
    return Patch(direction(si(table.latitude), table.local_time), angle)


def _toward(toward: str | SkyPoint) -> tuple[float, float, float]:
    if isinstance(toward, SkyPoint):
        return direction(si(toward.latitude), toward.local_time)
    return TOWARD[toward]


def _table(spec: RunSpec, key: str, table: speed_tables.TabulatedSpeed) -> Table:
    path = spec.folder / table.file
    try:
        speed, pdf = read_speed_table(path)
    except InputError as error:
        raise refuse(spec, f"{key}.file", table.file, str(error)) from None
    return Table(speed, pdf)


def _release_map(spec: RunSpec, key: str, table: place_tables.ReleaseMap, radius: float) -> FluxMap:
    found = read_map(spec, key, table.file, table.variable, FLUX_MAP)
    if not found.values.any():
        raise refuse(
            spec,
            f"{key}.variable",
            table.variable,
            f"of {table.file}: is 0 everywhere; must be above 0 somewhere",
        )
    return flux_map(found)


_SPEED: Mapping[type, Callable[[RunSpec, str, Any], SpeedLaw]] = MappingProxyType(
    {
        speed_tables.MaxwellFlux: lambda _spec, _key, t: MaxwellFlux(_kelvin(t.temperature)),
        speed_tables.MaxwellGas: lambda _spec, _key, t: MaxwellGas(_kelvin(t.temperature)),
        speed_tables.SingleSpeed: lambda _spec, _key, t: Single(si(t.speed)),
        speed_tables.SigmundThompson: lambda _spec, _key, t: SigmundThompson(
            si(t.binding_energy), si(t.cutoff_energy)
        ),
        speed_tables.TabulatedSpeed: _table,
    }
)
_DIRECTION: Mapping[type, Callable[[Any], DirectionLaw]] = MappingProxyType(
    {
        direction_tables.Cosine: lambda t: Cosine(t.power),
        direction_tables.Isotropic: lambda _t: Isotropic(),
        direction_tables.Normal: lambda _t: Normal(),
    }
)
_PLACE: Mapping[type, Callable[[RunSpec, str, Any, float], PlaceLaw]] = MappingProxyType(
    {
        place_tables.Uniform: lambda _spec, _key, _t, _radius: Uniform(),
        place_tables.CosinePower: lambda _spec, _key, t, _radius: CosinePower(_toward(t.toward), t.power),
        place_tables.Patch: _patch,
        place_tables.Band: lambda _spec, _key, t, _radius: Band(si(t.latitude[0]), si(t.latitude[1])),
        place_tables.ReleaseMap: _release_map,
    }
)
