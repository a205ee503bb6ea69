"""The body's constants: from the catalogue, from the run file, or both."""

from typing import NamedTuple

from tracer.catalogue.load import bodies, hosts
from tracer.catalogue.records import Orbit
from tracer.engine.refusal import refuse
from tracer.engine.runspec.run import RunSpec
from tracer.errors import InputError
from tracer.units import si


class BodyConstants(NamedTuple):
    """Constants of the body at hand.

    `radius` [m], `gm` [m3 s-2], `rotation_period` [s] sidereal, None where the ground does not turn; `orbit` about
    the Sun or about the host planet, None where unknown; `host_gm` [m3 s-2] of what it orbits.
    """

    radius: float
    gm: float
    rotation_period: float | None
    orbit: Orbit | None
    host_gm: float


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
    return BodyConstants(
        radius=si(table.radius) if table.radius is not None else known.radius,  # type: ignore[union-attr]
        gm=si(table.gm) if table.gm is not None else known.gm,  # type: ignore[union-attr]
        rotation_period=period,
        orbit=orbit,
        host_gm=(known.host if known else hosts()["Sun"]).gm,
    )


def overridden_constants(spec: RunSpec) -> tuple[str, ...]:
    """Return the keys of `[body]` that replace a constant of the catalogue."""
    if spec.body.name not in bodies():
        return ()
    return tuple(
        key for key in ("radius", "gm", "rotation_period", "orbit") if getattr(spec.body, key) is not None
    )


def _unknown_body(spec: RunSpec, missing: str) -> InputError:
    return refuse(
        spec,
        "body.name",
        spec.body.name,
        f"is not in the catalogue ({', '.join(bodies())}); for a body of your own give body.{missing}",
    )
