"""The catalogue's entries for machines: SI units, wind and light at 1 au."""

from collections.abc import Mapping
from typing import Any

from tracer.catalogue.light_records import Line, PhotoRate
from tracer.catalogue.records import Body, Gas


def body_figures(body: Body) -> Mapping[str, Any]:
    """Return a body's constants in SI units; albedo and emissivity are pure numbers."""
    return {
        "name": body.name,
        "host": body.host.name,
        "gm": body.gm,
        "radius": body.radius,
        "rotation_period": body.rotation_period,
        "semi_major_axis": body.orbit.semi_major_axis,
        "eccentricity": body.orbit.eccentricity,
        "heliocentric_semi_major_axis": body.heliocentric_orbit.semi_major_axis,
        "heliocentric_eccentricity": body.heliocentric_orbit.eccentricity,
        "bond_albedo": body.bond_albedo,
        "emissivity": body.emissivity,
        "equatorial_field": body.equatorial_field,
    }


def gas_figures(gas: Gas, rate: PhotoRate | None) -> Mapping[str, Any]:
    """Return a gas's mass [kg] and its rates of photo-loss at 1 au [s-1], None where unknown."""
    return {
        "species": gas.name,
        "description": gas.description,
        "mass": gas.mass,
        "photo_rate_quiet": rate and rate.quiet,
        "photo_rate_active": rate and rate.active,
        "photo_rate_low": rate and rate.low,
        "photo_rate_high": rate and rate.high,
        "ionizing_rate_quiet": rate and rate.ionizing_quiet,
        "ionizing_rate_active": rate and rate.ionizing_active,
        "photo_rate_basis": rate and rate.basis,
    }


def line_figures(line: Line) -> Mapping[str, Any]:
    """Return a line's wavelengths [m], f, and over which heliocentric velocities [m s-1] its g is known."""
    span = velocity_span(line)
    return {
        "name": line.name,
        "species": line.species,
        "wavelength": line.wavelength,
        "wavelength_air": line.wavelength_air,
        "oscillator_strength": line.oscillator_strength,
        "continuum_g": line.continuum_g,
        "g_from": g_origin(line),
        "g_velocity_from": span and span[0],
        "g_velocity_to": span and span[1],
    }


def g_origin(line: Line) -> str | None:
    """Return which table gives g: the residual flux goes before the table of g; None where neither does."""
    if line.residual_flux is not None and line.continuum_g is not None:
        return "residual flux"
    return None if line.g is None else "table of g"


def velocity_span(line: Line) -> tuple[float, float] | None:
    """Return the velocities [m s-1], positive away from the Sun, between which g is known; None where it isn't."""
    if line.residual_flux is not None and line.continuum_g is not None:
        velocities = [line.velocity_of_offset(offset) for offset in line.residual_flux.offset]
    elif line.g is not None:
        velocities = list(line.g.velocity)
    else:
        return None
    return min(velocities), max(velocities)
