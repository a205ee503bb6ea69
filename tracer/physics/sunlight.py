"""The conditions of a flight in sunlight, as kernels take them."""

import math

from tracer.catalogue.load import hosts
from tracer.constants import ASTRONOMICAL_UNIT, GM_SUN
from tracer.kernels.host import Host, HostOrbit
from tracer.kernels.motion import Conditions, Forces, Losses, Sky
from tracer.kernels.shadow import CONES, CYLINDER, NO_SHADOW, Shadow
from tracer.kernels.two_body import Orbit
from tracer.physics.lines import Floats, push_tables
from tracer.physics.orbit import Station

SHADOW_KINDS = {"none": NO_SHADOW, "cylinder": CYLINDER, "penumbra": CONES}


def shadow_of(kind: str, radius: float, distance: float) -> Shadow:
    """Return the shadow of a body of `radius` [m] at `distance` [m] from the Sun; `kind` is a word of the run file.

    Penumbra: cone of half angle asin((R_sun + R)/d); umbra: asin((R_sun - R)/d), with its tip at R/sin
    behind.
    """
    sun_radius = hosts()["Sun"].radius
    penumbra = umbra = 0.0
    if kind == "penumbra":
        penumbra = (sun_radius + radius) / distance
        umbra = (sun_radius - radius) / distance
    return Shadow(
        kind=SHADOW_KINDS[kind],
        radius=float(radius),
        sun_radius=float(sun_radius),
        penumbra_sine=penumbra,
        penumbra_cosine=math.sqrt(1.0 - penumbra * penumbra),
        umbra_sine=umbra,
        umbra_cosine=math.sqrt(1.0 - umbra * umbra),
        widening=0.0,
    )


def forces_of(
    *,
    gm: float,
    radius: float,
    outer_radius: float,
    station: Station,
    tide: bool,
    push: float,
    orbit: Orbit | None = None,
    host: Host | HostOrbit | None = None,
) -> Forces:
    """Return the forces on an atom near a body at `station`; `push` [m s-2] is constant, at 1 au, without the lines'.

    `gm` [m3 s-2] and `radius` [m] of the body; beyond `outer_radius` [m] a flight ends. With an `orbit` the body moves
    on it, and `station` is where it is at time 0. A moon has a `host`; where it moves, both are those of that.
    """
    return Forces(
        gm=float(gm),
        radius=float(radius),
        outer_radius=float(outer_radius),
        tide_gm=GM_SUN if tide else 0.0,
        distance=float(station.distance),
        radial_velocity=float(station.radial_velocity),
        turning=float(station.orbital_rate),
        push=float(push),
        light_distance=ASTRONOMICAL_UNIT,
        orbit=orbit,
        host=host,
    )


def losses_of(
    *,
    ionizing: float = 0.0,
    other_sunlight: float = 0.0,
    other_lit: float = 0.0,
    other_distance: float = 0.0,
    other_everywhere: float = 0.0,
) -> Losses:
    """Return rates of loss [s-1] as kernels take them (see `tracer.kernels.motion.Losses`), at 1 au where they fall."""
    return Losses(
        float(ionizing),
        float(other_sunlight),
        float(other_lit),
        float(other_distance),
        float(other_everywhere),
    )


def conditions_of(
    forces: Forces, losses: Losses, shadow: Shadow, pushing: Floats | None = None
) -> Conditions:
    """Return all that governs a flight; `pushing` are the lines' accelerations, None where no line pushes."""
    return Conditions(Sky(forces, losses, shadow), push_tables((), 1.0) if pushing is None else pushing)
