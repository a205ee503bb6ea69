"""Whether a body keeps a gas: thermal escape against the age of the Solar System, and sunlight against both.

Symbols: lambda jeans parameter, v_p most probable speed, H scale height; `gm` [m3 s-2] and `radius` [m] of the body.
"""

from math import inf, log, pi, sqrt
from typing import NamedTuple

from tracer.catalogue.photo_rates import photo_rates
from tracer.catalogue.records import Gas
from tracer.constants import ASTRONOMICAL_UNIT, SOLAR_SYSTEM_AGE
from tracer.physics.photo_losses import photo_loss
from tracer.physics.thermal import (
    escape_fraction,
    escape_speed,
    jeans_parameter,
    mean_speed,
    most_probable_speed,
    rms_speed,
    scale_height,
)

SIX_TIMES = 6.0
"""Where this many rms speeds exceed escape speed a gas leaks away in the age of the Solar System (common practice)."""

HYDRODYNAMIC_JEANS = 3.0
"""Below this jeans parameter a real gas flows out and needs collisions (Volkov et al. 2011, ApJ 729, L24)."""

ITERATIONS = 60
"""Enough for the last bit: each step of `kept_jeans_parameter` leaves less than half of the error."""


class PhotoLifetimes(NamedTuple):
    """Lifetimes [s] in full sunlight: under the quiet Sun, and the ends of the plausible range; how they are known."""

    quiet: float
    shortest: float
    longest: float
    basis: str


class GasRetention(NamedTuple):
    """One gas at the surface of one body, SI units.

    `six_rms_over_escape` is 6 rms speeds over escape speed, and `leaks_by_six_times_rule` whether it exceeds 1;
    `jeans_flux_per_density` [m s-1] is the escaping flux over the number density at the surface; `jeans_lifetime` [s]
    the e-folding time, infinite where the flux is too small to be a number; `photo_lifetime` [s] under the quiet Sun,
    with its plausible range, None without a distance or a known rate.
    """

    species: str
    mass: float
    most_probable_speed: float
    mean_speed: float
    rms_speed: float
    six_rms_over_escape: float
    leaks_by_six_times_rule: bool
    jeans_parameter: float
    hydrodynamic_outflow: bool
    scale_height: float
    jeans_flux_per_density: float
    jeans_lifetime: float
    outlives_solar_system: bool
    photo_lifetime: float | None
    photo_lifetime_shortest: float | None
    photo_lifetime_longest: float | None
    photo_rate_basis: str | None


def gas_retention(
    gas: Gas, *, gm: float, radius: float, temperature: float, distance: float | None
) -> GasRetention:
    """Return how a body of `gm` and `radius` keeps `gas` at `temperature` [K], `distance` [m] from the Sun."""
    jeans = jeans_parameter(gm, radius, temperature, gas.mass)
    rms = rms_speed(temperature, gas.mass)
    lifetime = jeans_lifetime(gm, radius, temperature, gas.mass)
    ratio = SIX_TIMES * rms / escape_speed(gm, radius)
    photo = None if distance is None else photo_lifetimes(gas.name, distance)
    return GasRetention(
        species=gas.name,
        mass=gas.mass,
        most_probable_speed=most_probable_speed(temperature, gas.mass),
        mean_speed=mean_speed(temperature, gas.mass),
        rms_speed=rms,
        six_rms_over_escape=ratio,
        leaks_by_six_times_rule=ratio > 1.0,
        jeans_parameter=jeans,
        hydrodynamic_outflow=jeans < HYDRODYNAMIC_JEANS,
        scale_height=scale_height(gm, radius, temperature, gas.mass),
        jeans_flux_per_density=jeans_flux_per_density(gm, radius, temperature, gas.mass),
        jeans_lifetime=lifetime,
        outlives_solar_system=lifetime > SOLAR_SYSTEM_AGE,
        photo_lifetime=None if photo is None else photo.quiet,
        photo_lifetime_shortest=None if photo is None else photo.shortest,
        photo_lifetime_longest=None if photo is None else photo.longest,
        photo_rate_basis=None if photo is None else photo.basis,
    )


def jeans_flux_per_density(gm: float, radius: float, temperature: float, mass: float) -> float:
    """Return F/n = v_p/(2 sqrt(pi)) (1 + lambda) exp(-lambda) [m s-1], escaping flux over surface number density.

    Jeans 1916, The Dynamical Theory of Gases; Chamberlain 1963, Planet. Space Sci. 11, 901 (memory). Holds for a
    gas without collisions whose launches are Maxwellian; `mass` [kg], `temperature` [K].
    """
    jeans = jeans_parameter(gm, radius, temperature, mass)
    return most_probable_speed(temperature, mass) / (2.0 * sqrt(pi)) * escape_fraction(jeans)


def jeans_lifetime(gm: float, radius: float, temperature: float, mass: float) -> float:
    """Return H / (F/n) [s], the e-folding time of a column n H by thermal escape; infinite where F/n underflows."""
    flux = jeans_flux_per_density(gm, radius, temperature, mass)
    return scale_height(gm, radius, temperature, mass) / flux if flux > 0.0 else inf


def kept_jeans_parameter(gm: float, radius: float, age: float = SOLAR_SYSTEM_AGE) -> float | None:
    """Return the jeans parameter above which the e-folding time by thermal escape exceeds `age` [s].

    Mass and temperature drop out: the time is 2 sqrt(pi) (R/v_esc) exp(lambda) / (sqrt(lambda) (1 + lambda)).
    The square root of the result is escape speed over most probable speed, sqrt(2/3) of that over rms speed.

    Returns
    -------
    float or None
        The jeans parameter; None where escape is so slow for the size of the body that every gas with a jeans
        parameter above `HYDRODYNAMIC_JEANS` outlives `age`.
    """
    wanted = log(age * escape_speed(gm, radius) / (2.0 * sqrt(pi) * radius))
    jeans = HYDRODYNAMIC_JEANS
    if wanted < jeans - _power_part(jeans):
        return None
    for _ in range(ITERATIONS):
        jeans = wanted + _power_part(jeans)
    return jeans


def _power_part(jeans: float) -> float:
    return 0.5 * log(jeans) + log(1.0 + jeans)


def photo_lifetimes(species: str, distance: float) -> PhotoLifetimes | None:
    """Return the lifetimes of `species` in sunlight at `distance` [m] from the Sun; None where no rate is known."""
    quiet = photo_loss(species, 0.0)
    if quiet is None:
        return None
    rate = photo_rates()[species]
    dilution = (ASTRONOMICAL_UNIT / distance) ** 2
    return PhotoLifetimes(
        1.0 / (dilution * quiet.total),
        1.0 / (dilution * rate.high),
        1.0 / (dilution * rate.low),
        rate.basis,
    )
