"""A flight by numerical integration: one accepted step at a time, cut where the flight or the shadow's zone ends.

A flight in progress is float64 (FLIGHT_SIZE,): time since launch [s]; x, y, z [m]; vx, vy, vz [m s-1]; the
ionising and the other hazard, whose sum's negative exponential is the survival; the slopes there; the next
step [s]; the step before the present zone [s]; the zone; the number of trial steps; where the body moves, the series
of `orbit`, of which distance [m], radial velocity [m s-1] and a host's phase are used. It can be kept and gone on with
at any time.
"""

import math

import numpy as np
from numba.extending import overload

from tracer.kernels.compiling import INLINED, inlined, kernel, merged
from tracer.kernels.crossing import (
    ANTUMBRA_EDGE,
    GROUND,
    HOST,
    NEVER,
    OUTER,
    PENUMBRA_EDGE,
    UMBRA_EDGE,
    first_crossing,
    time_to_edge,
)
from tracer.kernels.dense_output import (
    CURVE_SIZE,
    CURVE_ZONE,
    FLOWN,
    LENGTH,
    SERIES,
    START,
    hazards_at,
    place_at,
    set_component,
)
from tracer.kernels.endings import AGED, CROSSED, FLYING, LANDED, STRUCK, UNRESOLVED
from tracer.kernels.host import approach, host_neared, nearest, shade_and_nearness, without_host
from tracer.kernels.motion import rates_beside
from tracer.kernels.orbit import (
    SERIES_SIZE,
    body_in_series,
    body_on_orbit,
    keep_body,
    longest_on_orbit,
    set_series,
)
from tracer.kernels.runge_kutta import NODES, trial_step
from tracer.kernels.shadow import (
    CYLINDER,
    LIT,
    NO_SHADOW,
    PENUMBRA,
    penumbra_height,
    shadow_behind,
    umbra_height,
    zone_at,
    zone_beyond,
)
from tracer.kernels.step_control import error_scales, first_step, inverse_root, step_change, step_error

TIME = 0
PLACE = 1
HAZARDS = 7
SLOPES = 9
STEP = 14
OPEN_STEP = 15
ZONE = 16
TRIALS = 17
BODY = 18
FLIGHT_SIZE = BODY + SERIES_SIZE

MOST_TRIALS = 1_000_000.0
SHORTEST_STEP = 1e-13
"""Shortest step in units of the time since launch; below it the clock no longer moves."""

EDGE_PART = 0.3
LEAST_EDGE_PART = 0.01
"""First step inside a penumbra and least step to its edge, in units of the time that crossing it straight on takes."""

OVERSHOOT = 1.01
"""A step that would end at the penumbra's edge is made longer by this, so that curved ways reach the edge too."""


@kernel
def start_flight(flight, conditions, tolerance, x, y, z, vx, vy, vz):
    """Set `flight` to a launch at (x, y, z) [m] with velocity (vx, vy, vz) [m s-1] in the Sun-fixed frame.

    A body that moves is at its stated position then.
    """
    sky = conditions.sky
    body = body_on_orbit(sky.forces, 0.0)
    shadow = shadow_behind(sky.shadow, body)
    keep_body(body, flight, BODY, 1)
    r = math.sqrt(x * x + y * y + z * z)
    speed = math.sqrt(vx * vx + vy * vy + vz * vz)
    flight[TIME] = 0.0
    _set_place(flight, (x, y, z, vx, vy, vz))
    flight[HAZARDS] = 0.0
    flight[HAZARDS + 1] = 0.0
    zone = zone_at(shadow, x, y, z)
    set_slopes(flight, rates_beside(sky, conditions.push_tables, zone, body, (x, y, z), (vx, vy, vz)))
    climb = (x * vx + y * vy + z * vz) / r
    flight[STEP] = first_step(sky.forces, tolerance, r, climb, speed)
    flight[OPEN_STEP] = flight[STEP]
    flight[ZONE] = zone
    flight[TRIALS] = 0.0
    if zone == PENUMBRA:
        flight[STEP] = EDGE_PART * crossing_time(shadow, place_of(flight))


@inlined
def advance(flight, curve, conditions, tolerance, time_limit):
    """Make one accepted step of `flight`, store it in `curve` and return how the flight stands.

    The step is cut at the ground, at the outer sphere, at an edge of the shadow or at `time_limit` [s] since
    launch, whichever comes first: the flight goes on from there, and `curve[FLOWN]` says which part of the
    curve is flown. Returns FLYING, LANDED, CROSSED, AGED or UNRESOLVED.
    """
    sky, tables = conditions.sky, conditions.push_tables
    zone = int(flight[ZONE])
    place = place_of(flight)
    slopes = _slopes(flight)
    r = math.sqrt(place[0] * place[0] + place[1] * place[1] + place[2] * place[2])
    speed_squared = place[3] * place[3] + place[4] * place[4] + place[5] * place[5]
    _begin_series(sky.forces, flight, curve)
    body = body_in_series(sky.forces, curve, SERIES, 1, 0.0)
    nearness = nearest(body, sky.forces.radius, 1.0 / r, place[0], place[1], place[2])
    near = 1.0 / nearness[0] if nearness[0] > 1.0 / r else r
    scales = error_scales(tolerance, sky.forces, r, speed_squared, (near, nearness[1]))
    h = min(flight[STEP], longest_step(1.0 / r, speed_squared, slopes[0]))
    h = longest_on_orbit(sky.forces, curve, SERIES, 1, h)
    h = longest_beside_host(body, place, speed_squared, slopes[0], h)
    if zone == PENUMBRA:
        h = min(h, longest_step_in_penumbra(shadow_behind(sky.shadow, body), place))
    left = time_limit - flight[TIME]
    while True:
        last = h >= left
        if last:
            h = left
        flight[TRIALS] += 1.0
        growth, end_slopes, error, quartic = trial_step(
            sky, tables, zone, _bodies(sky.forces, curve, h), h, place[:3], place[3:], slopes
        )
        squared = step_error(error, scales)
        change = step_change(squared)
        if squared <= 1.0:
            break
        h *= min(change, 1.0)
        if not (h > SHORTEST_STEP * flight[TIME] and flight[TRIALS] < MOST_TRIALS):
            return _give_up(flight, curve)
    _store(curve, flight, h, place, slopes, growth, end_slopes, quartic)
    end = _moved(place, growth)
    flight[STEP] = h * change
    near = surfaces_near(sky, body, body_in_series(sky.forces, curve, SERIES, 1, h), zone, place, end)
    if near[0] or near[1] or near[2] or near[3]:
        surface, part = first_surface(sky, zone, curve, near, place, end)
        if part <= 1.0:
            return _cut(flight, curve, conditions, zone, surface, part)
    flight[TIME] += h
    keep_body(body_in_series(sky.forces, curve, SERIES, 1, h), flight, BODY, 1)
    _set_place(flight, end)
    flight[HAZARDS] += growth[2][0]
    flight[HAZARDS + 1] += growth[2][1]
    set_slopes(flight, end_slopes)
    if last:
        return AGED
    return FLYING if flight[TRIALS] < MOST_TRIALS else UNRESOLVED


@merged
def _begin_series(forces, flight, curve):
    for i in range(SERIES_SIZE):
        curve[SERIES + i] = flight[BODY + i]
    set_series(forces, curve, SERIES, 1)


@merged
def _bodies(forces, curve, h):
    return (
        body_in_series(forces, curve, SERIES, 1, 0.0),
        body_in_series(forces, curve, SERIES, 1, NODES[1] * h),
        body_in_series(forces, curve, SERIES, 1, NODES[2] * h),
        body_in_series(forces, curve, SERIES, 1, NODES[3] * h),
        body_in_series(forces, curve, SERIES, 1, NODES[4] * h),
        body_in_series(forces, curve, SERIES, 1, NODES[5] * h),
        body_in_series(forces, curve, SERIES, 1, NODES[6] * h),
    )


@kernel
def fly(flight, curve, conditions, tolerance, time_limit):
    """Advance `flight` to its end and return how it ends."""
    standing = FLYING
    while standing == FLYING:
        standing = advance(flight, curve, conditions, tolerance, time_limit)
    return standing


def new_flight() -> np.ndarray:
    """Return room for one flight in progress."""
    return np.zeros(FLIGHT_SIZE)


def new_curve() -> np.ndarray:
    """Return room for one step's curve."""
    return np.zeros(CURVE_SIZE)


@merged
def place_of(flight):
    return (
        flight[PLACE],
        flight[PLACE + 1],
        flight[PLACE + 2],
        flight[PLACE + 3],
        flight[PLACE + 4],
        flight[PLACE + 5],
    )


@merged
def _set_place(flight, place):
    flight[PLACE] = place[0]
    flight[PLACE + 1] = place[1]
    flight[PLACE + 2] = place[2]
    flight[PLACE + 3] = place[3]
    flight[PLACE + 4] = place[4]
    flight[PLACE + 5] = place[5]


@merged
def _moved(place, growth):
    return (
        place[0] + growth[0][0],
        place[1] + growth[0][1],
        place[2] + growth[0][2],
        place[3] + growth[1][0],
        place[4] + growth[1][1],
        place[5] + growth[1][2],
    )


@merged
def _slopes(flight):
    acceleration = (flight[SLOPES], flight[SLOPES + 1], flight[SLOPES + 2])
    return acceleration, (flight[SLOPES + 3], flight[SLOPES + 4])


@merged
def set_slopes(flight, slopes):
    flight[SLOPES] = slopes[0][0]
    flight[SLOPES + 1] = slopes[0][1]
    flight[SLOPES + 2] = slopes[0][2]
    flight[SLOPES + 3] = slopes[1][0]
    flight[SLOPES + 4] = slopes[1][1]


@merged
def _store(curve, flight, h, place, slopes, growth, end_slopes, quartic):
    curve[START] = flight[TIME]
    curve[LENGTH] = h
    curve[FLOWN] = 1.0
    curve[CURVE_ZONE] = flight[ZONE]
    end = _moved(place, growth)
    set_component(curve, 0, place[0], growth[0][0], h, place[3], end[3], quartic[0][0])
    set_component(curve, 1, place[1], growth[0][1], h, place[4], end[4], quartic[0][1])
    set_component(curve, 2, place[2], growth[0][2], h, place[5], end[5], quartic[0][2])
    set_component(curve, 3, place[3], growth[1][0], h, slopes[0][0], end_slopes[0][0], quartic[1][0])
    set_component(curve, 4, place[4], growth[1][1], h, slopes[0][1], end_slopes[0][1], quartic[1][1])
    set_component(curve, 5, place[5], growth[1][2], h, slopes[0][2], end_slopes[0][2], quartic[1][2])
    set_component(curve, 6, flight[HAZARDS], growth[2][0], h, slopes[1][0], end_slopes[1][0], quartic[2][0])
    set_component(
        curve, 7, flight[HAZARDS + 1], growth[2][1], h, slopes[1][1], end_slopes[1][1], quartic[2][1]
    )


@merged
def _give_up(flight, curve):
    curve[START] = flight[TIME]
    curve[LENGTH] = 0.0
    curve[FLOWN] = 0.0
    return UNRESOLVED


@merged
def surfaces_near(sky, start_body, end_body, zone, start, end):
    """Return which kinds of surface a step may have met: (ground, outer sphere, shadow edge, host).

    `start` and `end` (x, y, z, vx, vy, vz) are its ends, with the body as it is at each.
    """
    forces = sky.forces
    start_shadow, end_shadow = shadow_behind(sky.shadow, start_body), shadow_behind(sky.shadow, end_body)
    r0 = start[0] * start[0] + start[1] * start[1] + start[2] * start[2]
    r1 = end[0] * end[0] + end[1] * end[1] + end[2] * end[2]
    climb0 = start[0] * start[3] + start[1] * start[4] + start[2] * start[5]
    climb1 = end[0] * end[3] + end[1] * end[4] + end[2] * end[5]
    outer = forces.outer_radius * forces.outer_radius
    return (
        r1 < forces.radius * forces.radius or (climb0 < 0.0 and climb1 > 0.0),
        r1 > outer or (climb0 > 0.0 and climb1 < 0.0 and 4.0 * max(r0, r1) > outer),
        sky.shadow.kind != NO_SHADOW and not _sunward_in_light(start_shadow, end_shadow, zone, start, end),
        host_neared(start_body, end_body, start, end),
    )


@merged
def first_surface(sky, zone, curve, near, start, end):
    """Return (surface, part): what the step's curve meets first, and where; part is NEVER if nothing."""
    first, part, reach = 0, NEVER, 1.0
    for surface in (GROUND, HOST, OUTER, PENUMBRA_EDGE, UMBRA_EDGE, ANTUMBRA_EDGE):
        if _may_meet(sky.shadow, zone, surface, near):
            other = first_crossing(sky, surface, zone, curve, reach, start, end)
            if other < part:
                first, part = surface, other
                if surface == GROUND:
                    reach, end = part, place_at(curve, part)
    return first, part


@merged
def _may_meet(shadow, zone, surface, near):
    """Return True where `surface` bounds `zone` and is `near` (ground, outer sphere, shadow edge, host)."""
    if surface == GROUND:
        return near[0]
    if surface == HOST:
        return near[3]
    if surface == OUTER:
        return near[1]
    if zone == PENUMBRA:
        return near[2]
    if zone == LIT or shadow.kind == CYLINDER:
        return near[2] and surface == PENUMBRA_EDGE
    return near[2] and surface == zone


@merged
def _sunward_in_light(start_shadow, end_shadow, zone, start, end):
    """Return True where a step in full light stays sunward of all shadow, which most steps do."""
    return (
        zone == LIT
        and start[0] > start_shadow.radius * start_shadow.penumbra_sine
        and end[0] > end_shadow.radius * end_shadow.penumbra_sine
        and not (start[3] < 0.0 and end[3] > 0.0)
    )


@merged
def _cut(flight, curve, conditions, zone, surface, part):
    """End the step at `part` of its curve, at `surface`."""
    place = place_at(curve, part)
    curve[FLOWN] = part
    flight[TIME] += part * curve[LENGTH]
    body = body_in_series(conditions.sky.forces, curve, SERIES, 1, part * curve[LENGTH])
    keep_body(body, flight, BODY, 1)
    _set_place(flight, place)
    flight[HAZARDS], flight[HAZARDS + 1] = hazards_at(curve, part)
    if surface == GROUND:
        return LANDED
    if surface == OUTER:
        return CROSSED
    if surface == HOST:
        return STRUCK
    beyond = zone_beyond(conditions.sky.shadow, zone, surface)
    flight[ZONE] = beyond
    sky, tables = conditions.sky, conditions.push_tables
    set_slopes(flight, rates_beside(sky, tables, beyond, body, place[:3], place[3:]))
    if beyond == PENUMBRA:
        flight[OPEN_STEP] = flight[STEP]
        flight[STEP] = min(
            flight[STEP], EDGE_PART * crossing_time(shadow_behind(sky.shadow, body), place_of(flight))
        )
    else:
        flight[STEP] = max(flight[STEP], flight[OPEN_STEP])
    return FLYING


@inlined
def longest_step(per_r, speed_squared, acceleration):
    """Return the time [s], to a hundredth, in which an atom can come about as far as it is from the centre.

    A way without gravity has no error to bound its steps, and could pass the body twice in one.
    """
    pull = abs(acceleration[0]) + abs(acceleration[1]) + abs(acceleration[2])
    return inverse_root(max(per_r * (speed_squared * per_r + pull), 1e-300))


@inlined
def _longest_beside_host(host, place, speed_squared, acceleration, longest):
    _, per_way = shade_and_nearness(host, place[0], place[1], place[2])
    return min(longest, longest_step(per_way, approach(host, speed_squared), acceleration))


def longest_beside_host(body, place, speed_squared, acceleration, longest):
    """Return the lesser of a step `longest` [s] and the longest that misses neither the host nor its shadow."""
    if body.host is None:
        return longest
    return _longest_beside_host.py_func(body.host, place, speed_squared, acceleration, longest)


@overload(longest_beside_host, jit_options=INLINED)
def _compiled_longest_beside_host(body, place, speed_squared, acceleration, longest):
    if without_host(body):
        return lambda body, place, speed_squared, acceleration, longest: longest
    return lambda body, place, speed_squared, acceleration, longest: _longest_beside_host(
        body.host, place, speed_squared, acceleration, longest
    )


@kernel
def longest_step_in_penumbra(shadow, place):
    """Return a step [s] that goes just over the nearest edge, where the light has no second derivative."""
    return max(OVERSHOOT * time_to_edge(shadow, place), LEAST_EDGE_PART * crossing_time(shadow, place))


@kernel
def crossing_time(shadow, place):
    x, y, z, vx, vy, vz = place
    rho = math.sqrt(y * y + z * z)
    width = umbra_height(shadow, x, rho) - penumbra_height(shadow, x, rho)
    return width / math.sqrt(vx * vx + vy * vy + vz * vz)
