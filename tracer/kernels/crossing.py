"""Where a step's curve first passes the ground, the outer sphere, an edge of the shadow or the host.

Every surface is a height that is positive on the atom's side. A curve that starts and ends above a surface
may still dip below it: where it first nears and then leaves the surface, tangents bound how low it came. The shadow of
a moving body is taken at the moment itself.
"""

import math

from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.dense_output import LENGTH, SERIES, place_at
from tracer.kernels.host import host_height
from tracer.kernels.orbit import body_in_series
from tracer.kernels.shadow import (
    LIT,
    PENUMBRA,
    antumbra_height,
    penumbra_height,
    shadow_behind,
    umbra_height,
)

PENUMBRA_EDGE = 1
UMBRA_EDGE = 2
ANTUMBRA_EDGE = 3
GROUND = 4
OUTER = 5
HOST = 6

NEVER = 2.0
"""Part of a step, which is beyond its end."""

SHARP = 1e-12
"""A crossing is found to this height, in units of the distance from the centre."""

TOUCH = 1e-11
"""A start this near to a surface lies on it, and a dip less deep than this is none; same unit."""

HALVINGS = 80


@kernel
def height(shadow, outer_radius, surface, zone, place):
    """Return the height [m] over `surface` on the side of an atom in `zone`, and its rate of change [m s-1]."""
    x, y, z, vx, vy, vz = place
    if surface >= GROUND:
        r = math.sqrt(x * x + y * y + z * z)
        climb = (x * vx + y * vy + z * vz) / r
        if surface == GROUND:
            return r - shadow.radius, climb
        return outer_radius - r, -climb
    rho = math.sqrt(y * y + z * z)
    rho_rate = (y * vy + z * vz) / rho if rho > 0.0 else 0.0
    if surface == PENUMBRA_EDGE:
        h = penumbra_height(shadow, x, rho)
        sine, cosine = shadow.penumbra_sine, shadow.penumbra_cosine
        rate = rho_rate * cosine + vx * sine + _widened(shadow, sine, cosine, x, rho)
        if h == x - shadow.radius * sine:
            rate = vx - shadow.radius * shadow.widening * sine
        if zone != LIT:
            return -h, -rate
        return h, rate
    if surface == UMBRA_EDGE:
        h = umbra_height(shadow, x, rho)
        sine, cosine = shadow.umbra_sine, shadow.umbra_cosine
        rate = rho_rate * cosine - vx * sine + _widened(shadow, -sine, cosine, x, rho)
        if h == x + shadow.radius * sine:
            rate = vx + shadow.radius * shadow.widening * sine
    else:
        h = antumbra_height(shadow, x, rho)
        sine, cosine = shadow.umbra_sine, shadow.umbra_cosine
        rate = rho_rate * cosine + vx * sine + _widened(shadow, sine, cosine, x, rho)
    if zone == surface:
        return -h, -rate
    return h, rate


@inlined
def _widened(shadow, sine, cosine, x, rho):
    """Return the rate [m s-1] at which a height rho cos + x sin over a cone changes by the body's motion alone."""
    return shadow.widening * sine * (x - rho * (sine / cosine))


@inlined
def _height_on(sky, surface, zone, curve, part, place):
    """Return what `height` does at `part` of the step, where the atom is at `place`; the host's surface counts too."""
    body = body_in_series(sky.forces, curve, SERIES, 1, part * curve[LENGTH])
    if surface == HOST:
        return host_height(body, place)
    return height(shadow_behind(sky.shadow, body), sky.forces.outer_radius, surface, zone, place)


@kernel
def first_crossing(sky, surface, zone, curve, reach, start, end):
    """Return the part of the step at which its `curve` first passes `surface`, NEVER where it doesn't.

    Only the step up to its part `reach` counts; `start` and `end` are the places (x, y, z, vx, vy, vz) at the
    ends of that. Underground the shadow's surfaces have no meaning, so a step that lands counts up to its
    landing.
    """
    h = reach * curve[LENGTH]
    scale = math.sqrt(start[0] * start[0] + start[1] * start[1] + start[2] * start[2])
    f0, d0 = _height_on(sky, surface, zone, curve, 0.0, start)
    f1, d1 = _height_on(sky, surface, zone, curve, reach, end)
    d0 *= h
    d1 *= h
    launched = f0 <= TOUCH * scale
    right = 1.0
    if f1 >= 0.0:
        if d0 >= 0.0 or d1 <= 0.0:
            return NEVER
        ends = (f0, d0, f1, d1)
        right = _dip(sky, surface, zone, curve, reach, ends, TOUCH * scale)
        if right == NEVER:
            return NEVER
    if launched and (d0 <= 0.0 or f0 < -TOUCH * scale):
        return 0.0
    start = _parabola_root(f0, d0, f1, d1, launched)
    return reach * _root(sky, surface, zone, curve, reach, start, right, launched, scale)


@kernel
def _parabola_root(f0, d0, f1, d1, launched):
    """Return the first root of a parabola with height `f0` and slope `d0` at 0 and height `f1` at 1; 0 if none.

    Launched, it is height / part that is drawn as a parabola, which has the slope `d1` at 1 as well.
    """
    a, b, c = f0, d0, f1 - f0 - d0
    if launched:
        a, b, c = d0, 3.0 * f1 - 2.0 * d0 - d1, d0 - 2.0 * f1 + d1
    squared = b * b - 4.0 * a * c
    return 2.0 * a / (math.sqrt(squared) - b) if squared > 0.0 else 0.0


@kernel
def _dip(sky, surface, zone, curve, reach, ends, depth):
    """Return where on the way the height is below -`depth`, or NEVER; `ends` are height and slope, twice."""
    a, b = 0.0, 1.0
    fa, da, fb, db = ends
    for trial in range(HALVINGS):
        low = (fb - fa + da * a - db * b) / (da - db)
        bound = fa + da * (low - a)
        # Twice as deep as the tangents say, and not before four looks: they bound a bowl, a curve is one only
        # nearly.
        lesser = min(fa, fb)
        if trial > 3 and lesser + 2.0 * (bound - lesser) > -depth:
            return NEVER
        low = min(max(low, a + 0.05 * (b - a)), b - 0.05 * (b - a))
        f, d = _height_on(sky, surface, zone, curve, reach * low, place_at(curve, reach * low))
        if f < -depth:
            return low
        d *= reach * curve[LENGTH]
        if d < 0.0:
            a, fa, da = low, f, d
        else:
            b, fb, db = low, f, d
        if not da < db:
            return NEVER
    return NEVER


@kernel
def _root(sky, surface, zone, curve, reach, start, right, launched, scale):
    """Return where on the way, up to `right`, the height first becomes 0: Newton's method in a bracket from `start`.

    A start on the surface itself, `launched`, is divided out, height / part, so that the way back to it is found.
    """
    left = 0.0
    part = start if 0.0 < start < right else right
    for _ in range(HALVINGS):
        f, d = _height_on(sky, surface, zone, curve, reach * part, place_at(curve, reach * part))
        if abs(f) <= SHARP * scale:
            return part
        if f > 0.0:
            left = part
        else:
            right = part
        d *= reach * curve[LENGTH]
        if launched:
            d -= f / part
        guess = part - f / d
        if not left < guess < right:
            guess = 0.5 * (left + right)
        part = guess
    return right


@kernel
def time_to_edge(shadow, place):
    """Return the time [s] that an atom at `place` in the penumbra needs, straight on, to the nearest edge of it."""
    time = math.inf
    for edge in (PENUMBRA_EDGE, UMBRA_EDGE, ANTUMBRA_EDGE):
        h, rate = height(shadow, math.inf, edge, PENUMBRA, place)
        if rate < 0.0:
            time = min(time, -h / rate)
    return max(time, 0.0)
