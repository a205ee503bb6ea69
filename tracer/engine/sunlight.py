"""The Sun's part of a scene: where the body stands, what pushes, what shines and what destroys."""

from collections.abc import Iterator
from datetime import datetime
from typing import NamedTuple

import numpy as np

from tracer.catalogue.lines import lines_of
from tracer.catalogue.load import bodies, hosts
from tracer.constants import ASTRONOMICAL_UNIT
from tracer.engine.body_constants import BodyConstants
from tracer.engine.refusal import refuse
from tracer.engine.runspec.moment import moment_text
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.spectral_line import GTable, SpectralLineTable
from tracer.engine.runspec.sun import SunTable
from tracer.engine.two_columns import read_two_columns
from tracer.errors import InputError
from tracer.kernels.two_body import Orbit
from tracer.physics.ephemeris import KNOWN, MOON, Sighting, moon_sighting, sighting
from tracer.physics.host import MoonPlace, moon_as_seen, moon_at_phase
from tracer.physics.lines import VelocityTable, catalogue_table, constant_table, table_of
from tracer.physics.orbit import Station, orbit_through, station_at_distance, station_at_true_anomaly
from tracer.physics.photo_losses import PhotoLoss, photo_loss
from tracer.units import Quantity, si

KILOMETRE_PER_SECOND = 1e3
NO_PHOTO_LOSS = PhotoLoss(0.0, 0.0, True)


class Sunlight(NamedTuple):
    """The Sun as a body at `station` has it.

    `orbit` is None where the body stands still; one that moves is at `station` at time 0. `tide` says whether the Sun's
    tide acts, `shadow` is the run file's word. `lines` shine, and push as well if `lines_push`; `push` [m s-2] at 1 au
    comes beside them. `photo` holds the photo-losses at 1 au. `moon` is None where no host is near; `orbit` is the
    host's where one is.
    """

    station: Station
    orbit: Orbit | None
    tide: bool
    shadow: str
    lines: tuple[VelocityTable, ...]
    lines_push: bool
    push: float
    photo: PhotoLoss
    moon: MoonPlace | None = None

    @property
    def matters_in_flight(self) -> bool:
        """Whether anything but the turning of the frame depends on where an atom is under the Sun."""
        return bool(self.tide or self.lines or self.push or self.photo.total)


def resolve_sunlight(spec: RunSpec, body: BodyConstants) -> Sunlight | None:
    """Return the Sun's part of the scene, None where the run file has no `[sun]`.

    Raises
    ------
    InputError
        No orbit to stand on, a distance that the orbit never reaches, a push by lines that nothing is known of, or a
        table of g that cannot be used.
    """
    if spec.sun is None:
        return None
    lines = _lines(spec)
    lines_push, push = _push(spec, bool(lines))
    moon = _moon(spec, spec.sun, body)
    station = _station(spec, spec.sun, body) if moon is None else moon.station
    orbit = _orbit(spec, spec.sun, body, station if moon is None else moon.host_station)
    nearest = station.distance if orbit is None else orbit.semi_major_axis * (1.0 - orbit.eccentricity)
    _refuse_inside_the_sun(spec, body, nearest)
    return Sunlight(
        station=station,
        orbit=orbit,
        tide=spec.sun.tide,
        shadow=spec.sun.shadow,
        lines=lines,
        lines_push=lines_push,
        push=push,
        photo=_photo(spec, spec.sun),
        moon=moon,
    )


def lines_without_g(spec: RunSpec) -> tuple[str, ...]:
    """Return the catalogue's lines of the gas that neither push nor shine, since their g is not known."""
    own = {line.name for line in spec.gas.line}
    return tuple(line.name for line in lines_of(spec.gas.species) if not line.has_g and line.name not in own)


def replaced_lines(spec: RunSpec) -> tuple[str, ...]:
    """Return the catalogue's lines with known g that the run file replaces by its own."""
    own = {line.name for line in spec.gas.line}
    return tuple(line.name for line in lines_of(spec.gas.species) if line.has_g and line.name in own)


def _moon(spec: RunSpec, sun: SunTable, body: BodyConstants) -> MoonPlace | None:
    """Return where the body stands beside its host, None where it has none."""
    host = body.host
    if host is None:
        return None
    if sun.epoch is not None:
        if spec.body.name != MOON:
            sighting_at_epoch(spec, sun.epoch)
            raise refuse(
                spec,
                "body.host",
                None,
                f"beside sun.epoch is for the {MOON}; {spec.body.name} has no host there",
            )
        return moon_as_seen(moon_sighting(sun.epoch))
    assert host.phase_angle is not None
    station = _station(spec, sun, body)
    if not station.distance > 2.0 * host.distance:
        raise refuse(
            spec, "body.host.distance", None, "must be less than half of the host's distance from the Sun"
        )
    return moon_at_phase(station, host.distance, host.rate, host.phase_angle)


def _station(spec: RunSpec, sun: SunTable, body: BodyConstants) -> Station:
    orbit = body.heliocentric_orbit
    if sun.epoch is not None:
        return sighting_at_epoch(spec, sun.epoch).station
    if sun.true_anomaly is not None:
        if orbit is None:
            raise refuse(
                spec, "sun.true_anomaly", sun.true_anomaly, "needs an orbit; give body.orbit, or sun.distance"
            )
        return station_at_true_anomaly(orbit, si(sun.true_anomaly))
    assert sun.distance is not None
    velocity = 0.0 if sun.radial_velocity is None else si(sun.radial_velocity)
    try:
        return station_at_distance(orbit, si(sun.distance), velocity)
    except ValueError as error:
        raise refuse(spec, "sun.distance", sun.distance, str(error)) from None


def _orbit(spec: RunSpec, sun: SunTable, body: BodyConstants, station: Station) -> Orbit | None:
    """Return the orbit of a body that moves: that which osculates its motion at the stated position."""
    if sun.motion == "stationary":
        return None
    if sun.epoch is not None and body.heliocentric_orbit is not body.orbit:
        raise refuse(
            spec,
            "sun.motion",
            sun.motion,
            f"beside an epoch is for planets: {spec.body.name} swings about its host, which no orbit about the Sun "
            "follows; give sun.true_anomaly" + (", and body.host its phase_angle" if body.host else ""),
        )
    return orbit_through(station)


def _refuse_inside_the_sun(spec: RunSpec, body: BodyConstants, nearest: float) -> None:
    """Refuse a body that stands, or on its way comes, so near that the spheres touch: no cone is a shadow then."""
    least = hosts()["Sun"].radius + body.radius
    if nearest > least:
        return
    assert spec.sun is not None
    key = "sun.distance" if spec.sun.distance is not None else "body.orbit"
    raise refuse(
        spec,
        key,
        None,
        f"brings the body to {nearest / ASTRONOMICAL_UNIT:.4g} au from the Sun's centre, inside the Sun; must stay "
        f"above {least / ASTRONOMICAL_UNIT:.4g} au",
    )


def true_anomaly(spec: RunSpec) -> float | None:
    """Return where the body stands on its orbit about the Sun [deg], None where the run file gives the distance."""
    if spec.sun is None:
        return None
    if spec.sun.epoch is not None:
        return sighting_at_epoch(spec, spec.sun.epoch).true_anomaly
    return None if spec.sun.true_anomaly is None else si(spec.sun.true_anomaly)


def sighting_at_epoch(spec: RunSpec, epoch: datetime) -> Sighting:
    """Return where the ephemeris has the run file's body.

    Raises
    ------
    InputError
        The body is none that the ephemeris knows, or the run file gives it an orbit of its own.
    """
    known = [name for name in bodies() if name in KNOWN]
    if spec.body.name not in known:
        raise refuse(
            spec,
            "sun.epoch",
            moment_text(epoch),
            f"the ephemeris knows {' and '.join(known)} of the catalogue, not {spec.body.name}; give "
            "sun.true_anomaly or sun.distance",
        )
    if spec.body.orbit is not None:
        raise refuse(
            spec,
            "sun.epoch",
            moment_text(epoch),
            f"is for {spec.body.name} on its own orbit; leave out body.orbit, or give sun.true_anomaly",
        )
    return sighting(spec.body.name, epoch)


def _lines(spec: RunSpec) -> tuple[VelocityTable, ...]:
    own = [_own_line(spec, number, line) for number, line in enumerate(spec.gas.line, 1)]
    taken = {table.name for table in own}
    known = (catalogue_table(line) for line in lines_of(spec.gas.species) if line.name not in taken)
    return (*(table for table in known if table is not None), *own)


def _own_line(spec: RunSpec, number: int, line: SpectralLineTable) -> VelocityTable:
    wavelength = si(line.wavelength)
    if isinstance(line.g, Quantity):
        return constant_table(line.name, wavelength, si(line.g))
    key = f"gas.line[{number}].g.file"
    try:
        rows = read_two_columns(spec.folder / line.g.file, "radial velocity in km/s, g in 1/s", "km/s")
        velocities = np.array([row.first for row in rows]) * KILOMETRE_PER_SECOND
        return table_of(line.name, wavelength, velocities, np.array([row.second for row in rows]))
    except (InputError, ValueError) as error:
        raise refuse(spec, key, line.g.file, str(error)) from None


def _push(spec: RunSpec, lines_known: bool) -> tuple[bool, float]:
    """Return (whether the lines push, push at 1 au beside them [m s-2])."""
    wanted = spec.gas.radiation_acceleration
    if isinstance(wanted, Quantity):
        return False, si(wanted)
    if wanted == "lines" and not lines_known:
        raise refuse(
            spec,
            "gas.radiation_acceleration",
            wanted,
            f"no line of {spec.gas.species} with known g is in the catalogue; give its [[gas.line]], a push such as "
            '"0.05 m s-2" at 1 au, or "none"',
        )
    return wanted != "none" and lines_known, 0.0


def _photo(spec: RunSpec, sun: SunTable) -> PhotoLoss:
    given = spec.gas.photoionization_rate
    if given is not None:
        return PhotoLoss(si(given), 0.0, True)
    return photo_loss(spec.gas.species, sun.solar_activity) or NO_PHOTO_LOSS


def g_files(spec: RunSpec) -> Iterator[str]:
    """Yield the files of g that the run file refers to, as it writes them."""
    for line in spec.gas.line:
        if isinstance(line.g, GTable):
            yield line.g.file
