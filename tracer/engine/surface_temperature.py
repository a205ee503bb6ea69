"""From the run file's temperature tables to the kernels' law, one line a law."""

from collections.abc import Callable, Mapping
from math import pi, sqrt
from types import MappingProxyType
from typing import Any, NamedTuple

from tracer.engine.body_constants import BodyConstants
from tracer.engine.maps import TEMPERATURE_MAP, read_map
from tracer.engine.refusal import refuse
from tracer.engine.runspec import temperature as tables
from tracer.engine.runspec.run import RunSpec
from tracer.engine.sunlight import Sunlight
from tracer.kernels.temperature import (
    CONDUCTION,
    EQUILIBRIUM,
    HURLEY_2015,
    MAP,
    QUARTER_POWER,
    UNIFORM,
    SurfaceTemperature,
)
from tracer.physics.conduction import Ground, conduction_map
from tracer.physics.equilibrium import equilibrium_temperature
from tracer.physics.orbit import mean_motion, mean_sunlight_distance
from tracer.units import si

KEY = "surface.temperature"

NONE = 0.0
"""Temperature [K] that a law does not have."""

LOCKED = 1e-6
"""Share of the rotation rate below which the rate under the Sun is rounding: one side always faces the Sun."""


class Setting(NamedTuple):
    """Where the ground lies: the run file, its body, and the Sun, None where there is none."""

    spec: RunSpec
    body: BodyConstants
    sun: Sunlight | None


def surface_temperature(
    spec: RunSpec, body: BodyConstants, sun: Sunlight | None
) -> SurfaceTemperature | None:
    """Return the temperature law of the ground of `body` under `sun`, None where the run file has none.

    Raises
    ------
    InputError
        A map that cannot be used, or heat conduction in ground that does not turn under the Sun.
    """
    table = spec.surface.temperature
    return None if table is None else _LAWS[type(table)](Setting(spec, body, sun), table)


def synodic_rate(body: BodyConstants, sun: Sunlight) -> float | None:
    """Return the mean rate [rad s-1] at which the ground turns under the Sun, None where it has no rotation period.

    The mean motion is that of the body's heliocentric orbit, else that of a circle at the distance of `sun`.
    """
    if body.rotation_period is None:
        return None
    orbit = body.heliocentric_orbit
    return 2.0 * pi / body.rotation_period - (
        sun.station.orbital_rate if orbit is None else mean_motion(orbit)
    )


def mean_distance(body: BodyConstants, sun: Sunlight) -> float:
    """Return the distance [m] at which steady sunlight is that of the heliocentric orbit in the mean over time.

    Where there is no orbit it is the distance of `sun`.
    """
    orbit = body.heliocentric_orbit
    return sun.station.distance if orbit is None else mean_sunlight_distance(orbit)


def _equilibrium(setting: Setting, table: tables.EquilibriumTemperature) -> SurfaceTemperature:
    assert setting.sun is not None
    subsolar = equilibrium_temperature(table.albedo, table.emissivity, setting.sun.station.distance)
    return SurfaceTemperature(EQUILIBRIUM, subsolar, si(table.night))


def _map(setting: Setting, table: tables.TemperatureMap) -> SurfaceTemperature:
    found = read_map(setting.spec, KEY, table.file, table.variable, TEMPERATURE_MAP)
    return SurfaceTemperature(MAP, NONE, NONE, found)


def _conduction(setting: Setting, table: tables.Conduction) -> SurfaceTemperature:
    assert setting.sun is not None
    rate = synodic_rate(setting.body, setting.sun)
    if rate is None:
        raise refuse(
            setting.spec,
            KEY,
            table.law,
            'needs body.rotation_period, for example "60 d": the ground must turn',
        )
    period = setting.body.rotation_period
    if period is None or abs(rate) < LOCKED * 2.0 * pi / abs(period):
        raise refuse(
            setting.spec,
            KEY,
            table.law,
            'needs ground that turns under the Sun; must be for example "equilibrium"',
        )
    ground = Ground(_thermal_inertia(table), table.albedo, table.emissivity)
    distance = mean_distance(setting.body, setting.sun) if table.distance is None else si(table.distance)
    return SurfaceTemperature(CONDUCTION, NONE, NONE, conduction_map(ground, distance, rate))


def _thermal_inertia(table: tables.Conduction) -> float:
    if table.thermal_inertia is not None:
        return si(table.thermal_inertia)
    assert table.conductivity is not None
    assert table.density is not None
    assert table.heat_capacity is not None
    return sqrt(si(table.conductivity) * si(table.density) * si(table.heat_capacity))


_LAWS: Mapping[type, Callable[[Setting, Any], SurfaceTemperature]] = MappingProxyType(
    {
        tables.UniformTemperature: lambda _, t: SurfaceTemperature(UNIFORM, si(t.value), si(t.value)),
        tables.QuarterPower: lambda _, t: SurfaceTemperature(QUARTER_POWER, si(t.subsolar), si(t.night)),
        tables.EquilibriumTemperature: _equilibrium,
        tables.Hurley2015: lambda _, _table: SurfaceTemperature(HURLEY_2015, NONE, NONE),
        tables.TemperatureMap: _map,
        tables.Conduction: _conduction,
    }
)
