"""From the run file's temperature tables to the kernels' law, one line a law."""

from collections.abc import Callable, Mapping
from types import MappingProxyType
from typing import Any

from tracer.engine.maps import TEMPERATURE_MAP, read_map
from tracer.engine.runspec import temperature as tables
from tracer.engine.runspec.run import RunSpec
from tracer.engine.sunlight import Sunlight
from tracer.kernels.temperature import (
    EQUILIBRIUM,
    HURLEY_2015,
    MAP,
    QUARTER_POWER,
    UNIFORM,
    SurfaceTemperature,
)
from tracer.physics.equilibrium import equilibrium_temperature
from tracer.units import si

NONE = 0.0
"""Temperature [K] that a law does not have."""


def surface_temperature(spec: RunSpec, sun: Sunlight | None) -> SurfaceTemperature | None:
    """Return the temperature law of the ground under `sun`, None where the run file has none.

    Raises
    ------
    InputError
        A map that cannot be used.
    """
    table = spec.surface.temperature
    return None if table is None else _LAWS[type(table)](spec, sun, table)


def _equilibrium(
    _spec: RunSpec, sun: Sunlight | None, table: tables.EquilibriumTemperature
) -> SurfaceTemperature:
    assert sun is not None
    subsolar = equilibrium_temperature(table.albedo, table.emissivity, sun.station.distance)
    return SurfaceTemperature(EQUILIBRIUM, subsolar, si(table.night))


def _map(spec: RunSpec, _sun: Sunlight | None, table: tables.TemperatureMap) -> SurfaceTemperature:
    found = read_map(spec, "surface.temperature", table.file, table.variable, TEMPERATURE_MAP)
    return SurfaceTemperature(MAP, NONE, NONE, found)


_LAWS: Mapping[type, Callable[[RunSpec, Sunlight | None, Any], SurfaceTemperature]] = MappingProxyType(
    {
        tables.UniformTemperature: lambda _spec, _sun, t: SurfaceTemperature(
            UNIFORM, si(t.value), si(t.value)
        ),
        tables.QuarterPower: lambda _spec, _sun, t: SurfaceTemperature(
            QUARTER_POWER, si(t.subsolar), si(t.night)
        ),
        tables.EquilibriumTemperature: _equilibrium,
        tables.Hurley2015: lambda _spec, _sun, _t: SurfaceTemperature(HURLEY_2015, NONE, NONE),
        tables.TemperatureMap: _map,
    }
)
