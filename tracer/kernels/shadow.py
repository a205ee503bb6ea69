"""The zones of a body's shadow and the surfaces between them.

Inside a zone the light is a smooth function of place, so the integrator steps within one zone and stops at
its edge. The edges are the cones that touch both spheres: the inner tangents bound the penumbra, the outer
ones the umbra up to its tip and behind the tip the antumbra, where the body stands before the Sun as a ring's
hole.
"""

import math
from typing import Any, NamedTuple

from numba.extending import overload

from tracer.kernels.compiling import INLINED, inlined, kernel
from tracer.kernels.fused import fused
from tracer.kernels.orbit import MovingBody
from tracer.kernels.sunlight import visible_fraction

LIT = 0
PENUMBRA = 1
UMBRA = 2
ANTUMBRA = 3

NO_SHADOW = 0.0
CYLINDER = 1.0
CONES = 2.0


class Shadow(NamedTuple):
    """`kind` (NO_SHADOW, CYLINDER or CONES), the spheres' radii [m], and the cones' half angles as sine, cosine.

    Where the body moves, the angles are those at one moment, and the sines change at the relative rate `widening`
    [s-1].
    """

    kind: float
    radius: float
    sun_radius: float
    penumbra_sine: float
    penumbra_cosine: float
    umbra_sine: float
    umbra_cosine: float
    widening: float


@kernel
def penumbra_height(shadow, x, rho):
    """Return the height [m] over the penumbra's outer surface at `x` along and `rho` off the axis; below 0 inside.

    The cone starts at the circle where it touches the body: sunward of it the ground itself is nearer.
    """
    cone = rho * shadow.penumbra_cosine + x * shadow.penumbra_sine - shadow.radius
    return max(cone, x - shadow.radius * shadow.penumbra_sine)


@kernel
def umbra_height(shadow, x, rho):
    """Return the height [m] over the umbra's surface; below 0 no part of the Sun is seen."""
    cone = rho * shadow.umbra_cosine - x * shadow.umbra_sine - shadow.radius
    return max(cone, x + shadow.radius * shadow.umbra_sine)


@kernel
def antumbra_height(shadow, x, rho):
    """Return the height [m] over the antumbra's surface, the umbra's cone beyond its tip."""
    return rho * shadow.umbra_cosine + x * shadow.umbra_sine + shadow.radius


@kernel
def zone_at(shadow, x, y, z):
    """Return the zone of the shadow at (x, y, z) [m]."""
    rho = math.sqrt(y * y + z * z)
    if shadow.kind == NO_SHADOW or penumbra_height(shadow, x, rho) >= 0.0:
        return LIT
    if shadow.kind == CYLINDER or umbra_height(shadow, x, rho) < 0.0:
        return UMBRA
    if antumbra_height(shadow, x, rho) < 0.0:
        return ANTUMBRA
    return PENUMBRA


@inlined
def _shadow_of_moving(shadow, body):
    cones = shadow.kind == CONES
    per_distance = 1.0 / body.distance
    penumbra = (shadow.sun_radius + shadow.radius) * per_distance if cones else 0.0
    umbra = (shadow.sun_radius - shadow.radius) * per_distance if cones else 0.0
    return Shadow(
        shadow.kind,
        shadow.radius,
        shadow.sun_radius,
        penumbra,
        math.sqrt(1.0 - penumbra * penumbra),
        umbra,
        math.sqrt(1.0 - umbra * umbra),
        -body.radial_velocity * per_distance,
    )


def shadow_behind(shadow: Any, body: Any) -> Any:
    """Return the shadow as it is behind `body`, the Forces of one that stands still, or a MovingBody."""
    return _shadow_of_moving.py_func(shadow, body) if isinstance(body, MovingBody) else shadow


@overload(shadow_behind, jit_options=INLINED)
def _compiled_shadow_behind(shadow, body):
    if "turning_growth" in body.fields:
        return lambda shadow, body: _shadow_of_moving(shadow, body)
    return lambda shadow, body: shadow


@inlined
def _widened(widening, sine, cosine, x, rho, rate):
    return fused(widening * sine, fused(-rho, sine / cosine, x), rate)


def with_widening(body, widening, sine, cosine, x, rho, rate):
    """Return the `rate` [m s-1] of a height rho cos + x sin over a cone, with that of the cone where the body moves."""
    if isinstance(body, MovingBody):
        return _widened.py_func(widening, sine, cosine, x, rho, rate)
    return rate


@overload(with_widening, jit_options=INLINED)
def _compiled_with_widening(body, widening, sine, cosine, x, rho, rate):
    if "turning_growth" in body.fields:
        return lambda body, widening, sine, cosine, x, rho, rate: _widened(
            widening, sine, cosine, x, rho, rate
        )
    return lambda body, widening, sine, cosine, x, rho, rate: rate


@inlined
def lit_fraction(shadow, zone, x, y, z, distance):
    """Return the visible part of the Sun's disc at (x, y, z) [m] for an atom that is in `zone`."""
    if zone == LIT:
        return 1.0
    if zone == UMBRA:
        return 0.0
    return visible_fraction(x, y, z, distance, shadow.radius, shadow.sun_radius)


@kernel
def zone_beyond(shadow, zone, edge):
    """Return the zone that an atom enters as it leaves `zone` through `edge` (PENUMBRA, UMBRA or ANTUMBRA)."""
    if zone == LIT:
        return UMBRA if shadow.kind == CYLINDER else PENUMBRA
    if zone == PENUMBRA:
        return LIT if edge == PENUMBRA else edge
    return LIT if shadow.kind == CYLINDER else PENUMBRA
