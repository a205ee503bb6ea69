"""One lane at a time: where a flight begins, what its step meets, and the parts that it flies by itself."""

import math

from tracer.kernels import integrated_flight as one
from tracer.kernels import lanes as row
from tracer.kernels.apart import lane_value
from tracer.kernels.compiling import inlined, kernel, merged
from tracer.kernels.crossing import (
    ANTUMBRA_EDGE,
    GROUND,
    HALVINGS,
    HOST,
    OUTER,
    PENUMBRA_EDGE,
    SHARP,
    UMBRA_EDGE,
    height,
)
from tracer.kernels.dense_output import COEFFICIENTS, CURVE_ZONE, FLOWN, LENGTH, SERIES, START, place_at
from tracer.kernels.endings import AGED, CROSSED, FLYING, LANDED, STRUCK, UNRESOLVED
from tracer.kernels.lane_rates import lane_rates
from tracer.kernels.lane_step import DOUBTFUL, LANDS, lane_place, try_steps
from tracer.kernels.lanes import WIDTH
from tracer.kernels.orbit import SERIES_SIZE, body_in_series, body_on_orbit, keep_body
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


@inlined
def end_in_lane(lanes, lane, state):
    """Return (ending, survival, time [s], position, velocity) of a flight, as `ground.come_down` takes it.

    Its last state is that from row `state` on.
    """
    return (
        int(lane_value(lanes, row.STANDING + lane)),
        lane_value(lanes, row.KEPT + lane),
        lane_value(lanes, row.TIME + lane),
        *lane_place(lanes, state, lane),
    )


@merged
def step_lanes(lanes, sky, tables, curve):
    """Make a step in every lane, and cut or end what landed or met another surface."""
    try_steps(lanes, sky, tables)
    land_lanes(lanes, sky.forces.radius)
    for lane in range(WIDTH):
        if lanes[row.FLAGGED + lane] == DOUBTFUL:
            look_closer(lanes, lane, sky, tables, curve)


@kernel
def look_closer(lanes, lane, sky, tables, curve):
    """Decide what a doubtful step met: cut it there, end the flight, or let it pass."""
    if lanes[row.ACCEPTED + lane] == 0.0:
        lanes[row.STANDING + lane] = UNRESOLVED
        return
    zone = int(lanes[row.ZONE + lane])
    start = lane_place(lanes, row.START, lane)
    end = lane_place(lanes, row.END, lane)
    h = lanes[row.LENGTH + lane]
    body = body_in_series(sky.forces, lanes, row.SERIES + lane, WIDTH, 0.0)
    end_body = body_in_series(sky.forces, lanes, row.SERIES + lane, WIDTH, h)
    shadows = shadow_behind(sky.shadow, body), shadow_behind(sky.shadow, end_body)
    near = one.surfaces_near(sky, body, end_body, zone, start, end)
    near_sphere = near[0] or near[1] or near[3]
    if near_sphere or (near[2] and _edge_met(shadows, sky.forces, zone, start, end)):
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
def _edge_met(shadows, forces, zone, start, end):
    """Return False where a step that ends above ground passes or nears no edge of its zone: see `first_crossing`.

    `shadows` are those at the step's start and end.
    """
    for edge in (PENUMBRA_EDGE, UMBRA_EDGE, ANTUMBRA_EDGE):
        if zone == PENUMBRA or edge in (PENUMBRA_EDGE, zone):
            above, rate = height(shadows[1], forces.outer_radius, edge, zone, end)
            if above < 0.0:
                return True
            if rate > 0.0 and height(shadows[0], forces.outer_radius, edge, zone, start)[1] < 0.0:
                return True
    return False


@kernel
def land_lanes(lanes, radius):
    """Cut the steps that are flagged as landing where they pass the ground.

    The lanes are listed first, so that the processor can be at work on several landings at a time: it would guess wrong
    which of all lanes land, and drop what it had begun.
    """
    count = 0
    for lane in range(WIDTH):
        lanes[row.APART + count] = lane
        count += 1 if lanes[row.FLAGGED + lane] == LANDS else 0
    for i in range(count):
        _land(lanes, int(lanes[row.APART + i]), radius)


@inlined
def _land(lanes, lane, radius):
    """Cut a step that starts well above ground and ends below it where it passes the ground.

    Newton's method for the square of the distance from the centre, in a bracket; as sharp as `crossing`. It starts
    where the cubic passes that has the same values and slopes at the ends. Two steps of it, and more until the next
    error, which goes with the square of the last change, is small enough: seldom.
    """
    h = lanes[row.LENGTH + lane]
    way = (
        _polynomial(lanes, lane, h, 0),
        _polynomial(lanes, lane, h, row.Y),
        _polynomial(lanes, lane, h, row.Z),
    )
    goal = radius * radius
    part, left, right, _ = _nearer(way, goal, _passing(lanes, lane, h, goal), 0.0, 1.0)
    for _ in range(HALVINGS):
        part, left, right, miss = _nearer(way, goal, part, left, right)
        if miss <= 0.1 * SHARP * goal:
            break
    part = min(part, 1.0)
    lanes[row.STANDING + lane] = LANDED
    lanes[row.FLOWN + lane] = part
    for axis in range(0, 3 * WIDTH, WIDTH):
        lanes[row.END + axis + lane] = _value_and_slope(_polynomial(lanes, lane, h, axis), part)[0]
        at = row.VELOCITY + axis
        lanes[row.END + at + lane] = _value_and_slope(_polynomial(lanes, lane, h, at), part)[0]


@inlined
def _nearer(way, goal, part, left, right):
    """Return a part of the `way` nearer to where its square is `goal`, the bracket, and the change's square [m2]."""
    px, dx = _value_and_slope(way[0], part)
    py, dy = _value_and_slope(way[1], part)
    pz, dz = _value_and_slope(way[2], part)
    f = px * px + py * py + pz * pz - goal
    left, right = (part, right) if f > 0.0 else (left, part)
    change = -0.5 * f / (px * dx + py * dy + pz * dz)
    miss = (dx * dx + dy * dy + dz * dz) * (change * change)
    part += change
    lost = not (left < part < right) and miss > 0.1 * SHARP * goal
    return 0.5 * (left + right) if lost else part, left, right, miss


@inlined
def _passing(lanes, lane, h, goal):
    """Return about where a step's square of the distance from the centre falls to `goal`, between 0 and 1."""
    x, y, z, vx, vy, vz = lane_place(lanes, row.START, lane)
    end_x, end_y, end_z, end_vx, end_vy, end_vz = lane_place(lanes, row.END, lane)
    above = x * x + y * y + z * z - goal
    below = end_x * end_x + end_y * end_y + end_z * end_z - goal
    fall = 2.0 * h * (x * vx + y * vy + z * vz)
    bend = below - above - fall
    rest = 2.0 * h * (end_x * end_vx + end_y * end_vy + end_z * end_vz) - fall - 2.0 * bend
    part = above / (above - below)
    for _ in range(3):
        # The cubic is above + part (fall + part inner).
        inner = bend + (part - 1.0) * rest
        slope = fall + part * (2.0 * inner + part * rest)
        part = min(1.0, max(0.0, part - (above + part * (fall + part * inner)) / slope))
    return part


@inlined
def _polynomial(lanes, lane, h, component):
    """Return the five coefficients of `dense_output` of place or velocity, `component` its row within a state."""
    at = component + lane
    growth = lanes[row.GROWTH + at]
    bend = h * lanes[row.START + row.VELOCITY + at] - growth
    rest = growth - h * lanes[row.SEVENTH + at] - bend
    return lanes[row.START + at], growth, bend, rest, lanes[row.QUARTIC + at]


@inlined
def _value_and_slope(coefficients, part):
    """Return the value at `part` of a step, and its derivative with respect to it."""
    start, growth, bend, rest, quartic = coefficients
    left = 1.0 - part
    inner = rest + left * quartic
    middle = bend + part * inner
    outer = growth + left * middle
    slope = inner - part * quartic
    slope = left * slope - middle
    return start + part * outer, outer + part * slope


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
    if surface == HOST:
        lanes[row.STANDING + lane] = STRUCK
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
    for i in range(SERIES_SIZE):
        curve[SERIES + i] = lanes[row.SERIES + i * WIDTH + lane]
    for i in range(6):
        start, growth, bend, rest, quartic = _polynomial(lanes, lane, h, i * WIDTH)
        k = COEFFICIENTS + 5 * i
        curve[k] = start
        curve[k + 1] = growth
        curve[k + 2] = bend
        curve[k + 3] = rest
        curve[k + 4] = quartic


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
