"""The body's constants: from the catalogue, from the run file, or both."""

import math
from typing import NamedTuple

from tracer.catalogue.load import bodies, hosts
from tracer.catalogue.records import Body, Orbit
from tracer.engine.refusal import refuse
from tracer.engine.runspec.body import HostTable
from tracer.engine.runspec.run import RunSpec
from tracer.errors import InputError
from tracer.physics.host import kepler_period
from tracer.units import si

DAY = 86400.0
MOST_MISFIT = 0.05
"""By how much a moon's period may differ from that of a circle about host and moon alone."""


class HostConstants(NamedTuple):
    """Constants of the body's host.

    `gm` [m3 s-2] and `radius` [m] of the host, `distance` [m] of the two, `rate` [rad s-1] at which the moon goes round
    it among the stars, `phase_angle` [deg], None where an epoch tells it.
    """

    name: str
    gm: float
    radius: float
    distance: float
    rate: float
    phase_angle: float | None


class BodyConstants(NamedTuple):
    """Constants of the body at hand.

    `radius` [m], `gm` [m3 s-2], `rotation_period` [s] sidereal, None where the ground does not turn; `orbit` about
    the Sun or about the host planet, None where unknown; `host_gm` [m3 s-2] of what it orbits; `heliocentric_orbit` is
    the host's where the host is a planet. `host` is None where the run file has none: then nothing is near.
    """

    radius: float
    gm: float
    rotation_period: float | None
    orbit: Orbit | None
    host_gm: float
    heliocentric_orbit: Orbit | None
    host: HostConstants | None


def resolve_body(spec: RunSpec) -> BodyConstants:
    """Return the constants of the run file's body; those it gives go before the catalogue's.

    Raises
    ------
    InputError
        The name is in no catalogue and radius or gm are missing.
    """
    table = spec.body
    known = bodies().get(table.name)
    if known is None:
        for key in ("radius", "gm"):
            if getattr(table, key) is None:
                raise _unknown_body(spec, key)
    orbit = known.orbit if known else None
    if table.orbit is not None:
        orbit = Orbit(si(table.orbit.semi_major_axis), table.orbit.eccentricity)
    period = known.rotation_period if known else None
    if table.rotation_period is not None:
        period = si(table.rotation_period)
    gm = si(table.gm) if table.gm is not None else known.gm  # type: ignore[union-attr]
    radius = si(table.radius) if table.radius is not None else known.radius  # type: ignore[union-attr]
    heliocentric_orbit = (known.host.orbit if known else None) or orbit
    host = None
    if table.host is not None:
        host = _host(spec, table.host, known, (gm, radius))
        if table.host.rotation == "locked":
            period = 2.0 * math.pi / host.rate
        elif period is None:
            raise refuse(spec, "body.rotation_period", None, 'missing; host.rotation is "turning"')
        orbit = Orbit(host.distance, 0.0)
    return BodyConstants(
        radius=radius,
        gm=gm,
        rotation_period=period,
        orbit=orbit,
        host_gm=host.gm if host else (known.host if known else hosts()["Sun"]).gm,
        heliocentric_orbit=heliocentric_orbit,
        host=host,
    )


def _host(spec: RunSpec, table: HostTable, known: Body | None, moon: tuple[float, float]) -> HostConstants:
    """Return the constants of the host that `table` gives to a moon of (gm, radius); those it lacks are `known`."""
    moon_gm, moon_radius = moon
    if known is not None and known.host.orbit is None:
        known = None
    if known is not None and spec.body.orbit is not None:
        raise refuse(
            spec,
            "body.orbit",
            None,
            f"is that of {known.name} about {known.host.name}, which body.host.distance says; must be left out",
        )
    for key, example in (("gm", "1.267e8 km3 s-2"), ("radius", "70000 km"), ("distance", "500000 km")):
        if known is None and getattr(table, key) is None:
            raise refuse(
                spec,
                f"body.host.{key}",
                None,
                f'missing; {spec.body.name} is no moon of the catalogue; write for example "{example}"',
            )
    _refuse_phase(spec, table, known)
    gm = si(table.gm) if table.gm is not None else known.host.gm  # type: ignore[union-attr]
    radius = si(table.radius) if table.radius is not None else known.host.radius  # type: ignore[union-attr]
    distance = si(table.distance) if table.distance is not None else known.orbit.semi_major_axis  # type: ignore[union-attr]
    if not distance > radius + moon_radius:
        raise refuse(
            spec,
            "body.host.distance",
            table.distance,
            f"must be above {radius + moon_radius:g} m, where the spheres of moon and host touch",
        )
    return HostConstants(
        name=known.host.name if known else f"the host of {spec.body.name}",
        gm=gm,
        radius=radius,
        distance=distance,
        rate=2.0 * math.pi / _period(spec, table, known, distance, gm + moon_gm),
        phase_angle=None if table.phase_angle is None else si(table.phase_angle),
    )


def _refuse_phase(spec: RunSpec, table: HostTable, known: Body | None) -> None:
    """Refuse a phase told twice or not at all."""
    epoch = None if spec.sun is None else spec.sun.epoch
    if epoch is None:
        if table.phase_angle is None:
            raise refuse(
                spec,
                "body.host.phase_angle",
                None,
                'missing; write for example "180 deg", new moon, or give the Moon a sun.epoch',
            )
        return
    for key in ("distance", "period", "phase_angle"):
        if (given := getattr(table, key)) is not None:
            raise refuse(
                spec,
                f"body.host.{key}",
                given,
                "stands beside sun.epoch, which tells it; must be one of the two",
            )


def _period(spec: RunSpec, table: HostTable, known: Body | None, distance: float, gm: float) -> float:
    """Return the period [s] of the moon's orbit: the run file's, the catalogue's, or that of a circle."""
    own = table.distance is not None or table.gm is not None
    if table.period is None and known is not None and not own:
        # The moons of the catalogue are locked: they turn as they go round.
        return known.rotation_period
    if gm == 0.0:
        if table.period is None:
            raise refuse(spec, "body.host.period", None, "missing; without gravity nothing else tells it")
        return si(table.period)
    circular = kepler_period(distance, gm)
    if table.period is None:
        return circular
    if abs(abs(si(table.period)) / circular - 1.0) > MOST_MISFIT:
        raise refuse(
            spec,
            "body.host.period",
            table.period,
            f"is not that of the distance: Kepler's third law gives {circular / DAY:.6g} d, from which it may differ "
            "by 5 %",
        )
    return si(table.period)


def overridden_constants(spec: RunSpec) -> tuple[str, ...]:
    """Return the keys of `[body]` that replace a constant of the catalogue."""
    known = bodies().get(spec.body.name)
    if known is None:
        return ()
    keys = [
        key for key in ("radius", "gm", "rotation_period", "orbit") if getattr(spec.body, key) is not None
    ]
    if (host := spec.body.host) is not None and known.host.orbit is not None:
        of_host = ("gm", "radius", "distance", "period")
        keys += [f"host.{key}" for key in of_host if getattr(host, key) is not None]
    return tuple(keys)


def _unknown_body(spec: RunSpec, missing: str) -> InputError:
    return refuse(
        spec,
        "body.name",
        spec.body.name,
        f"is not in the catalogue ({', '.join(bodies())}); for a body of your own give body.{missing}",
    )
