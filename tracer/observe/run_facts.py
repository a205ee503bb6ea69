"""What the run file inside a product tells an observer: the gas, its sources, the Sun, the traced space."""

import math
from typing import NamedTuple

from tracer.catalogue.lines import lines
from tracer.catalogue.load import bodies, gases, hosts
from tracer.catalogue.records import Body, Orbit
from tracer.physics.orbit import hill_radius
from tracer.physics.thermal import most_probable_speed
from tracer.product.run_file import Table, entries, table, tables_of, value


class LineFacts(NamedTuple):
    """A line's vacuum `wavelength` [m] and absorption `oscillator_strength`; NaN where the catalogue has none."""

    wavelength: float
    oscillator_strength: float


class RunFacts(NamedTuple):
    """Facts from a run file; what it does not tell is None, empty, or NaN in `doppler_speeds`.

    `mass` [kg] of an atom; `doppler_speeds` [m s-1] of the releases by name; `shadow` is the run file's word, None
    without a Sun; `orbit` about the Sun and `outer_radius` [m] of the traced space.
    """

    species: str
    mass: float | None
    doppler_speeds: dict[str, float]
    shadow: str | None
    orbit: Orbit | None
    outer_radius: float | None


def run_facts(text: str, radius: float, ground_temperature: float | None) -> RunFacts:
    """Return the facts in a run file's `text`, for a body of `radius` [m].

    `ground_temperature` [K] stands for the temperature of gas that leaves at that of the surface.
    """
    run = tables_of(text)
    gas, sun = table(run, "gas"), table(run, "sun")
    species = str(gas.get("species", ""))
    mass = value(gas, "mass", "mass", radius)
    if mass is None and species in gases():
        mass = gases()[species].mass
    speeds = {
        str(entry.get("name")): _doppler_speed(table(entry, "speed"), mass, ground_temperature)
        for entry in entries(run, "release")
    }
    orbit, hill = _orbit_and_hill_radius(table(run, "body"), radius)
    outer = value(table(run, "domain"), "outer_radius", "length or radii", radius)
    return RunFacts(
        species=species,
        mass=mass,
        doppler_speeds=speeds,
        shadow=str(sun.get("shadow", "penumbra")) if sun else None,
        orbit=orbit,
        outer_radius=hill if outer is None else outer,
    )


def line_facts(name: str, species: str) -> LineFacts:
    """Return what the catalogue knows of the line `name` of `species`; a line of the user's own is not in it."""
    line = lines().get(name)
    if line is None or line.species != species:
        return LineFacts(math.nan, math.nan)
    return LineFacts(line.wavelength, line.oscillator_strength)


def _doppler_speed(speed: Table, mass: float | None, ground_temperature: float | None) -> float:
    """Return the speed [m s-1] by which a line is widened: the most probable one of the law of release.

    sqrt(2kT/m) of a Maxwellian; sqrt(U/m), at which E/(E+U)^3 peaks, of sputtered atoms; NaN where the law's table is
    not in the product.
    """
    law = speed.get("law")
    if law == "single":
        return value(speed, "speed", "speed", 1.0) or math.nan
    if mass is None:
        return math.nan
    if law == "sigmund-thompson":
        return math.sqrt((value(speed, "binding_energy", "energy", 1.0) or math.nan) / mass)
    if law not in ("maxwell-flux", "maxwell-gas"):
        return math.nan
    at_ground = speed.get("temperature") == "surface"
    kelvin = ground_temperature if at_ground else value(speed, "temperature", "temperature", 1.0)
    return math.nan if kelvin is None else most_probable_speed(kelvin, mass)


def _orbit_and_hill_radius(body: Table, radius: float) -> tuple[Orbit | None, float | None]:
    known = bodies().get(str(body.get("name")))
    given = table(body, "orbit")
    orbit = known.orbit if known else None
    axis = value(given, "semi_major_axis", "length", radius)
    if axis is not None:
        orbit = Orbit(axis, float(given.get("eccentricity", 0.0)))
    gm = value(body, "gm", "gravitational parameter", radius)
    if gm is None and known:
        gm = known.gm
    host = known.host if known else hosts()["Sun"]
    if "host" in body:
        return host.orbit or orbit, None if gm is None else _hill_radius_about_host(
            table(body, "host"), known, gm
        )
    if orbit is None:
        return None, None
    return host.orbit or orbit, None if gm is None else hill_radius(orbit, gm, host.gm)


def _hill_radius_about_host(host: Table, known: Body | None, gm: float) -> float | None:
    """Return a (m/3M)^(1/3) [m] of a moon on a circle about the `host` that its run file tells, or the catalogue."""
    host_gm = value(host, "gm", "gravitational parameter", 1.0)
    distance = value(host, "distance", "length", 1.0)
    if known is not None:
        host_gm = known.host.gm if host_gm is None else host_gm
        distance = known.orbit.semi_major_axis if distance is None else distance
    if not host_gm or distance is None:
        return None
    return hill_radius(Orbit(distance, 0.0), gm, host_gm)
