"""A flight by numerical integration: one accepted step at a time, cut where the flight or the shadow's zone ends.

A flight in progress is float64 (FLIGHT_SIZE,): time since launch [s]; x, y, z [m]; vx, vy, vz [m s-1]; the
ionising and the other hazard, whose sum's negative exponential is the survival; the slopes there; the next
step [s]; the step before the present zone [s]; the zone; the number of trial steps. It can be kept and gone
on with at any time.
"""

import math

import numpy as np

from tracer.kernels.compiling import inlined, kernel, merged
from tracer.kernels.crossing import (
    ANTUMBRA_EDGE,
    GROUND,
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
    START,
    hazards_at,
    place_at,
    set_component,
)
from tracer.kernels.dormand_prince import trial_step
from tracer.kernels.endings import AGED, CROSSED, FLYING, LANDED, UNRESOLVED
from tracer.kernels.motion import rates_of_change
from tracer.kernels.shadow import (
    CYLINDER,
    LIT,
    NO_SHADOW,
    PENUMBRA,
    penumbra_height,
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
FLIGHT_SIZE = 18

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
    """Set `flight` to a launch at (x, y, z) [m] with velocity (vx, vy, vz) [m s-1] in the Sun-fixed frame."""
    r = math.sqrt(x * x + y * y + z * z)
    speed = math.sqrt(vx * vx + vy * vy + vz * vz)
    flight[TIME] = 0.0
    _set_place(flight, (x, y, z, vx, vy, vz))
    flight[HAZARDS] = 0.0
    flight[HAZARDS + 1] = 0.0
    zone = zone_at(conditions.sky.shadow, x, y, z)
    set_slopes(flight, rates_of_change(conditions.sky, conditions.push_tables, zone, (x, y, z), (vx, vy, vz)))
    climb = (x * vx + y * vy + z * vz) / r
    flight[STEP] = first_step(conditions.sky.forces, tolerance, r, climb, speed)
    flight[OPEN_STEP] = flight[STEP]
    flight[ZONE] = zone
    flight[TRIALS] = 0.0
    if zone == PENUMBRA:
        flight[STEP] = EDGE_PART * crossing_time(conditions.sky.shadow, place_of(flight))


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
    scales = error_scales(tolerance, sky.forces.gm, r, speed_squared)
    h = min(flight[STEP], longest_step(1.0 / r, speed_squared, slopes[0]))
    if zone == PENUMBRA:
        h = min(h, longest_step_in_penumbra(sky.shadow, place))
    left = time_limit - flight[TIME]
    while True:
        last = h >= left
        if last:
            h = left
        flight[TRIALS] += 1.0
        growth, end_slopes, error, quartic = trial_step(sky, tables, zone, h, place[:3], place[3:], slopes)
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
    near = surfaces_near(sky, zone, place, end)
    if near[0] or near[1] or near[2]:
        surface, part = first_surface(sky, zone, curve, near, place, end)
        if part <= 1.0:
            return _cut(flight, curve, conditions, zone, surface, part)
    flight[TIME] += h
    _set_place(flight, end)
    flight[HAZARDS] += growth[2][0]
    flight[HAZARDS + 1] += growth[2][1]
    set_slopes(flight, end_slopes)
    if last:
        return AGED
    return FLYING if flight[TRIALS] < MOST_TRIALS else UNRESOLVED


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
def surfaces_near(sky, zone, start, end):
    """Return which kinds of surface a step may have met: (ground, outer sphere, shadow edge)."""
    forces = sky.forces
    r0 = start[0] * start[0] + start[1] * start[1] + start[2] * start[2]
    r1 = end[0] * end[0] + end[1] * end[1] + end[2] * end[2]
    climb0 = start[0] * start[3] + start[1] * start[4] + start[2] * start[5]
    climb1 = end[0] * end[3] + end[1] * end[4] + end[2] * end[5]
    outer = forces.outer_radius * forces.outer_radius
    return (
        r1 < forces.radius * forces.radius or (climb0 < 0.0 and climb1 > 0.0),
        r1 > outer or (climb0 > 0.0 and climb1 < 0.0 and 4.0 * max(r0, r1) > outer),
        sky.shadow.kind != NO_SHADOW and not _sunward_in_light(sky.shadow, zone, start, end),
    )


@merged
def first_surface(sky, zone, curve, near, start, end):
    """Return (surface, part): what the step's curve meets first, and where; part is NEVER if nothing."""
    first, part, reach = 0, NEVER, 1.0
    for surface in (GROUND, OUTER, PENUMBRA_EDGE, UMBRA_EDGE, ANTUMBRA_EDGE):
        if _may_meet(sky.shadow, zone, surface, near):
            other = first_crossing(
                sky.shadow, sky.forces.outer_radius, surface, zone, curve, reach, start, end
            )
            if other < part:
                first, part = surface, other
                if surface == GROUND:
                    reach, end = part, place_at(curve, part)
    return first, part


@merged
def _may_meet(shadow, zone, surface, near):
    """Return True where `surface` bounds `zone` and is `near` (ground, outer sphere, shadow edge)."""
    if surface == GROUND:
        return near[0]
    if surface == OUTER:
        return near[1]
    if zone == PENUMBRA:
        return near[2]
    if zone == LIT or shadow.kind == CYLINDER:
        return near[2] and surface == PENUMBRA_EDGE
    return near[2] and surface == zone


@merged
def _sunward_in_light(shadow, zone, start, end):
    """Return True where a step in full light stays sunward of all shadow, which most steps do."""
    terminator = shadow.radius * shadow.penumbra_sine
    return (
        zone == LIT
        and start[0] > terminator
        and end[0] > terminator
        and not (start[3] < 0.0 and end[3] > 0.0)
    )


@merged
def _cut(flight, curve, conditions, zone, surface, part):
    """End the step at `part` of its curve, at `surface`."""
    place = place_at(curve, part)
    curve[FLOWN] = part
    flight[TIME] += part * curve[LENGTH]
    _set_place(flight, place)
    flight[HAZARDS], flight[HAZARDS + 1] = hazards_at(curve, part)
    if surface == GROUND:
        return LANDED
    if surface == OUTER:
        return CROSSED
    beyond = zone_beyond(conditions.sky.shadow, zone, surface)
    flight[ZONE] = beyond
    sky, tables = conditions.sky, conditions.push_tables
    set_slopes(flight, rates_of_change(sky, tables, beyond, place[:3], place[3:]))
    if beyond == PENUMBRA:
        flight[OPEN_STEP] = flight[STEP]
        flight[STEP] = min(flight[STEP], EDGE_PART * crossing_time(conditions.sky.shadow, place_of(flight)))
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
