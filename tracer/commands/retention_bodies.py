"""The bodies that a user asks about: from the catalogue, from options, or both."""

from collections.abc import Sequence
from typing import NamedTuple

from tracer.catalogue.load import bodies
from tracer.catalogue.records import Body
from tracer.commands.choices import unknown_name
from tracer.constants import ASTRONOMICAL_UNIT
from tracer.errors import InputError
from tracer.physics.equilibrium import equilibrium_temperature
from tracer.units import quoted


class Circumstances(NamedTuple):
    """What options say, in SI units; None where they don't."""

    radius: float | None
    gm: float | None
    temperature: float | None
    distance: float | None
    field: float | None


class Subject(NamedTuple):
    """A body as it is judged, SI units; `*_origin` say where a value comes from, `host` the planet of a moon.

    `distance` is None for a body of the user's own without one; `equatorial_field` likewise.
    """

    name: str
    radius: float
    gm: float
    distance: float | None
    distance_origin: str
    temperature: float
    temperature_origin: str
    equatorial_field: float | None
    host: str | None
    notes: tuple[str, ...]


def subject(name: str, given: Circumstances) -> Subject:
    """Return the body called `name` under the circumstances `given`.

    Raises
    ------
    InputError
        The name is not in the catalogue and its constants are not given.
    """
    known = bodies().get(name)
    return _own_body(name, given) if known is None else _catalogue_body(known, given)


def catalogue_subjects() -> tuple[Subject, ...]:
    """Return every body of the catalogue under its own circumstances."""
    return tuple(
        _catalogue_body(body, Circumstances(None, None, None, None, None)) for body in bodies().values()
    )


def check_overrides(names: Sequence[str], given: Circumstances) -> None:
    """Refuse constants of one body that are given for several."""
    constants = {"--radius": given.radius, "--gm": given.gm}
    for option, value in constants.items():
        if value is not None and len(names) > 1:
            raise InputError(f"{option}: goes with one BODY, not with {len(names)}")


def _own_body(name: str, given: Circumstances) -> Subject:
    if given.radius is None and given.gm is None:
        raise unknown_name("BODY", name, bodies(), "; for a body of your own give --radius and --gm")
    return Subject(
        name=name,
        radius=_needed("--radius", given.radius, name, "1800 km"),
        gm=_needed("--gm", given.gm, name, "9500 km3 s-2"),
        distance=given.distance,
        distance_origin="as given" if given.distance is not None else "not given",
        temperature=_needed("--temperature", given.temperature, name, "600 K"),
        temperature_origin="as given",
        equatorial_field=given.field,
        host=None,
        notes=(),
    )


def _needed(option: str, value: float | None, name: str, example: str) -> float:
    if value is None:
        raise InputError(
            f"{option}: missing; {quoted(name)} is not in the catalogue, so give for example {option} "
            f"{quoted(example)}"
        )
    return value


def _catalogue_body(body: Body, given: Circumstances) -> Subject:
    orbit = body.heliocentric_orbit
    distance = orbit.semi_major_axis if given.distance is None else given.distance
    temperature, origin = given.temperature, "as given"
    if temperature is None:
        temperature = equilibrium_temperature(body.bond_albedo, body.emissivity, distance)
        origin = (
            f"subsolar equilibrium at that distance, bond albedo {body.bond_albedo:g} and emissivity "
            f"{body.emissivity:g} of the catalogue: the hottest ground, hence the cautious choice"
        )
    owner = "" if body.host.orbit is None else f" of {body.host.name}"
    return Subject(
        name=body.name,
        radius=body.radius if given.radius is None else given.radius,
        gm=body.gm if given.gm is None else given.gm,
        distance=distance,
        distance_origin=f"semi-major axis of the orbit{owner} about the Sun"
        if given.distance is None
        else "as given",
        temperature=temperature,
        temperature_origin=origin,
        equatorial_field=body.equatorial_field if given.field is None else given.field,
        host=None if body.host.orbit is None else body.host.name,
        notes=tuple(_notes(body, given)),
    )


def _notes(body: Body, given: Circumstances) -> list[str]:
    notes = []
    replaced = [key for key, value in (("radius", given.radius), ("gm", given.gm)) if value is not None]
    if replaced:
        notes.append(f"{' and '.join(replaced)} as given replace the catalogue's values of {body.name}")
    orbit = body.heliocentric_orbit
    nearest = orbit.semi_major_axis * (1.0 - orbit.eccentricity)
    farthest = orbit.semi_major_axis * (1.0 + orbit.eccentricity)
    if given.distance is not None and not 0.999 * nearest <= given.distance <= 1.001 * farthest:
        notes.append(
            f"{body.name} comes no nearer to the Sun than {nearest / ASTRONOMICAL_UNIT:.4g} au and no farther than "
            f"{farthest / ASTRONOMICAL_UNIT:.4g} au: the distance given is a what-if"
        )
    return notes
