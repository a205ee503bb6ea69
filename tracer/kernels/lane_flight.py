"""One lane at a time: where a flight begins, what its step meets, and the parts that it flies by itself."""

import math

from tracer.kernels import integrated_flight as one
from tracer.kernels import lanes as row
from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.crossing import GROUND, OUTER
from tracer.kernels.dense_output import CURVE_ZONE, FLOWN, LENGTH, SERIES, START, place_at, set_component
from tracer.kernels.endings import AGED, CROSSED, FLYING, LANDED, UNRESOLVED
from tracer.kernels.lane_step import lane_place, lane_rates
from tracer.kernels.lanes import WIDTH
from tracer.kernels.orbit import ORDER, body_in_series, body_on_orbit, keep_body
from tracer.kernels.shadow import PENUMBRA, shadow_behind, zone_at, zone_beyond
from tracer.kernels.step_control import STEP_SHARE, first_step


@kernel
def launch_in_lane(lanes, lane, conditions, tolerance, clock, time_limit, place):
    """Launch an atom at `place` (x, y, z [m], vx, vy, vz [m s-1]), to fly with `tolerance` for `time_limit` [s].

    What `integrated_flight.start_flight` does, at the time `clock` [s] after the stated position of a moving body.
    """
    sky, tables = conditions.sky, conditions.push_tables
    x, y, z, vx, vy, vz = place
    body = body_on_orbit(sky.forces, clock)
    keep_body(body, lanes, row.SERIES + lane, WIDTH)
    shadow = shadow_behind(sky.shadow, body)
    zone = zone_at(shadow, x, y, z)
    r = math.sqrt(x * x + y * y + z * z)
    speed = math.sqrt(vx * vx + vy * vy + vz * vz)
    step = first_step(sky.forces, tolerance, r, (x * vx + y * vy + z * vz) / r, speed)
    lanes[row.OPEN_STEP + lane] = step
    lanes[row.STEP + lane] = step
    if zone == PENUMBRA:
        lanes[row.STEP + lane] = one.EDGE_PART * one.crossing_time(shadow, place)
    for i in range(6):
        lanes[row.START + i * WIDTH + lane] = place[i]
    _set_rates(lanes, row.START, lane, sky, tables, zone, body, place)
    allowed = STEP_SHARE * tolerance
    lanes[row.PER_ALLOWED + lane] = 1.0 / (allowed * allowed)
    lanes[row.TIME_LIMIT + lane] = time_limit
    lanes[row.TIME + lane] = 0.0
    lanes[row.ZONE + lane] = zone
    lanes[row.TRIALS + lane] = 0.0
    lanes[row.KEPT + lane] = 1.0
    lanes[row.STANDING + lane] = FLYING


@kernel
def look_closer(lanes, lane, sky, tables, curve):
    """Decide what a flagged step met: cut it there, end the flight, or let it pass."""
    if lanes[row.ACCEPTED + lane] == 0.0:
        lanes[row.STANDING + lane] = UNRESOLVED
        return
    zone = int(lanes[row.ZONE + lane])
    start = lane_place(lanes, row.START, lane)
    end = lane_place(lanes, row.END, lane)
    h = lanes[row.LENGTH + lane]
    shadow = shadow_behind(sky.shadow, body_in_series(sky.forces, lanes, row.SERIES + lane, WIDTH, 0.0))
    end_shadow = shadow_behind(sky.shadow, body_in_series(sky.forces, lanes, row.SERIES + lane, WIDTH, h))
    near = one.surfaces_near(sky, shadow, end_shadow, zone, start, end)
    if near[0] or near[1] or near[2]:
        _draw_curve(lanes, lane, curve)
        surface, part = one.first_surface(sky, zone, curve, near, start, end)
        if part <= 1.0:
            _cut(lanes, lane, sky, tables, curve, zone, surface, part)
            return
    if lanes[row.LAST + lane] > 0.0:
        lanes[row.STANDING + lane] = AGED
    elif lanes[row.TRIALS + lane] >= one.MOST_TRIALS:
        lanes[row.STANDING + lane] = UNRESOLVED


@inlined
def _cut(lanes, lane, sky, tables, curve, zone, surface, part):
    """End a lane's step at `part` of its curve, at `surface`."""
    place = place_at(curve, part)
    lanes[row.FLOWN + lane] = part
    for i in range(6):
        lanes[row.END + i * WIDTH + lane] = place[i]
    if surface == GROUND:
        lanes[row.STANDING + lane] = LANDED
        return
    if surface == OUTER:
        lanes[row.STANDING + lane] = CROSSED
        return
    body = body_in_series(sky.forces, lanes, row.SERIES + lane, WIDTH, part * lanes[row.LENGTH + lane])
    beyond = zone_beyond(sky.shadow, zone, surface)
    lanes[row.ZONE + lane] = beyond
    step = lanes[row.STEP + lane]
    if beyond == PENUMBRA:
        lanes[row.OPEN_STEP + lane] = step
        shadow = shadow_behind(sky.shadow, body)
        lanes[row.STEP + lane] = min(step, one.EDGE_PART * one.crossing_time(shadow, place))
    else:
        lanes[row.STEP + lane] = max(step, lanes[row.OPEN_STEP + lane])
    _set_rates(lanes, row.END, lane, sky, tables, beyond, body, place)


@inlined
def _draw_curve(lanes, lane, curve):
    h = lanes[row.LENGTH + lane]
    curve[START] = lanes[row.TIME + lane]
    curve[LENGTH] = h
    curve[FLOWN] = 1.0
    curve[CURVE_ZONE] = lanes[row.ZONE + lane]
    for i in range(ORDER + 1):
        curve[SERIES + i] = lanes[row.SERIES + i * WIDTH + lane]
    for i in range(6):
        at = i * WIDTH + lane
        first = lanes[row.START + row.VELOCITY + at]
        last = lanes[row.SEVENTH + at]
        set_component(
            curve, i, lanes[row.START + at], lanes[row.GROWTH + at], h, first, last, lanes[row.QUARTIC + at]
        )


@inlined
def _set_rates(lanes, first, lane, sky, tables, zone, body, place):
    """Set what a state holds beside its place."""
    acceleration, light, other, nearness = lane_rates(sky, tables, zone, body, place[:3], place[3:])
    lanes[first + row.ACCELERATION + lane] = acceleration[0]
    lanes[first + row.ACCELERATION + row.Y + lane] = acceleration[1]
    lanes[first + row.ACCELERATION + row.Z + lane] = acceleration[2]
    lanes[first + row.LIGHT + lane] = light
    lanes[first + row.OTHER + lane] = other
    lanes[first + row.NEARNESS + lane] = nearness
