"""What is said of a body and its gases, in SI units, for people and machines alike."""

from collections.abc import Sequence
from typing import NamedTuple

from tracer.catalogue.records import Gas
from tracer.commands.retention_bodies import Subject
from tracer.physics.magnetopause import CURVED_BOUNDARY, FLAT_SHEET, standoff, wind_pressure
from tracer.physics.retention import HYDRODYNAMIC_JEANS, GasRetention, gas_retention, kept_jeans_parameter
from tracer.physics.thermal import escape_speed


class Wind(NamedTuple):
    """Protons of number `density` [m-3] at `speed` [m s-1]."""

    density: float
    speed: float


class BodyReport(NamedTuple):
    """One body, SI units; None where unknown or without a wind; `host` is the planet of a moon.

    `kept_jeans_parameter`: above it thermal escape takes longer than the age of the Solar System;
    `standoff_*` [radii from the centre]; `meets_wind_directly` where the flat sheet's stand-off is under one radius or
    there is no field.
    """

    name: str
    host: str | None
    radius: float
    gm: float
    escape_speed: float
    distance: float | None
    distance_origin: str
    temperature: float
    temperature_origin: str
    kept_jeans_parameter: float | None
    equatorial_field: float | None
    standoff_flat_sheet: float | None
    standoff_curved_boundary: float | None
    meets_wind_directly: bool | None
    gases: tuple[GasRetention, ...]
    notes: tuple[str, ...]


def body_report(one: Subject, gases: Sequence[Gas], wind: Wind | None) -> BodyReport:
    """Return what is to be said of a body, its `gases` and a `wind`, None where none is given."""
    kept = tuple(
        gas_retention(gas, gm=one.gm, radius=one.radius, temperature=one.temperature, distance=one.distance)
        for gas in gases
    )
    flat = curved = None
    if wind is not None and one.equatorial_field is not None:
        pressure = wind_pressure(wind.density, wind.speed)
        flat = standoff(one.equatorial_field, pressure, FLAT_SHEET)
        curved = standoff(one.equatorial_field, pressure, CURVED_BOUNDARY)
    return BodyReport(
        name=one.name,
        host=one.host,
        radius=one.radius,
        gm=one.gm,
        escape_speed=escape_speed(one.gm, one.radius),
        distance=one.distance,
        distance_origin=one.distance_origin,
        temperature=one.temperature,
        temperature_origin=one.temperature_origin,
        kept_jeans_parameter=kept_jeans_parameter(one.gm, one.radius),
        equatorial_field=one.equatorial_field,
        standoff_flat_sheet=flat,
        standoff_curved_boundary=curved,
        meets_wind_directly=_meets_wind(one.equatorial_field, flat),
        gases=kept,
        notes=(*one.notes, *_host_note(one, wind), *_outflow_note(kept)),
    )


def _meets_wind(field: float | None, flat: float | None) -> bool | None:
    if field == 0.0:
        return True
    return None if flat is None else flat < 1.0


def _host_note(one: Subject, wind: Wind | None) -> tuple[str, ...]:
    if wind is None or one.host is None or not one.equatorial_field:
        return ()
    return (
        f"the stand-off is against the wind given; inside the magnetosphere of {one.host} that wind does not reach "
        f"{one.name}, and the field and plasma of {one.host} count",
    )


def _outflow_note(gases: Sequence[GasRetention]) -> tuple[str, ...]:
    names = [gas.species for gas in gases if gas.hydrodynamic_outflow]
    if not names:
        return ()
    return (
        f"! {', '.join(names)}: jeans parameter below {HYDRODYNAMIC_JEANS:g}; a real gas flows out there and "
        "collisions matter (Volkov et al. 2011): outside the model unless the gas is very thin, and its jeans "
        "lifetime does not hold",
    )
