"""Where the steps that land pass the ground, in all lanes at once."""

from tracer.kernels.apart import lane_value, set_lane_value
from tracer.kernels.compiling import inlined, kernel
from tracer.kernels.crossing import SHARP
from tracer.kernels.endings import LANDED
from tracer.kernels.fused import fused
from tracer.kernels.lane_step import DOUBTFUL, LANDS
from tracer.kernels.lanes import (
    END,
    FLAGGED,
    FLOWN,
    GROWTH,
    LENGTH,
    QUARTIC,
    SEVENTH,
    STANDING,
    START,
    VELOCITY,
    WIDTH,
    Y,
    Z,
)

NEWTON_STEPS = 5
"""What is not sharp after as many is left to the general search."""


@kernel
def land(lanes, radius):
    """Cut the steps flagged `LANDS` where they pass the ground; those where that is hard to find become `DOUBTFUL`.

    Newton's method for the square of the distance from the centre, from where a straight line between its values at the
    step's ends passes; as sharp as `crossing`.
    """
    goal = radius * radius
    for lane in range(WIDTH):
        h = lane_value(lanes, LENGTH + lane)
        x, y, z = _polynomial(lanes, lane, h, 0), _polynomial(lanes, lane, h, Y), _polynomial(lanes, lane, h, Z)
        above = x[0] * x[0] + y[0] * y[0] + z[0] * z[0] - goal
        end_x, end_y, end_z = x[0] + x[1], y[0] + y[1], z[0] + z[1]
        below = goal - (end_x * end_x + end_y * end_y + end_z * end_z)
        part = above / (above + below)
        for _ in range(NEWTON_STEPS):
            (px, dx), (py, dy), (pz, dz) = _at(x, part), _at(y, part), _at(z, part)
            f = fused(px, px, fused(py, py, fused(pz, pz, -goal)))
            part = part - 0.5 * f / fused(px, dx, fused(py, dy, pz * dz))
        px, py, pz = _at(x, part)[0], _at(y, part)[0], _at(z, part)[0]
        f = fused(px, px, fused(py, py, fused(pz, pz, -goal)))
        flag = lane_value(lanes, FLAGGED + lane)
        sharp = (abs(f) <= 2.0 * SHARP * goal) & (part > 0.0) & (part <= 1.0)
        cut = (flag == LANDS) & sharp
        set_lane_value(lanes, FLAGGED + lane, DOUBTFUL if (flag == LANDS) & (not sharp) else flag)
        standing = lane_value(lanes, STANDING + lane)
        set_lane_value(lanes, STANDING + lane, float(LANDED) if cut else standing)
        flown = lane_value(lanes, FLOWN + lane)
        set_lane_value(lanes, FLOWN + lane, part if cut else flown)
        vx = _at(_polynomial(lanes, lane, h, VELOCITY), part)[0]
        vy = _at(_polynomial(lanes, lane, h, VELOCITY + Y), part)[0]
        vz = _at(_polynomial(lanes, lane, h, VELOCITY + Z), part)[0]
        _end(lanes, END + lane, px, cut)
        _end(lanes, END + Y + lane, py, cut)
        _end(lanes, END + Z + lane, pz, cut)
        _end(lanes, END + VELOCITY + lane, vx, cut)
        _end(lanes, END + VELOCITY + Y + lane, vy, cut)
        _end(lanes, END + VELOCITY + Z + lane, vz, cut)


@inlined
def _end(lanes, at, value, cut):
    whole = lane_value(lanes, at)
    set_lane_value(lanes, at, value if cut else whole)


@inlined
def _polynomial(lanes, lane, h, component):
    """Return the five coefficients of `dense_output` of place or velocity, `component` its row within a state."""
    at = component + lane
    growth = lane_value(lanes, GROWTH + at)
    bend = h * lane_value(lanes, START + VELOCITY + at) - growth
    rest = growth - h * lane_value(lanes, SEVENTH + at) - bend
    return lane_value(lanes, START + at), growth, bend, rest, lane_value(lanes, QUARTIC + at)


@inlined
def _at(coefficients, part):
    """Return the value at `part` of a step, and its derivative with respect to it."""
    start, growth, bend, rest, quartic = coefficients
    left = 1.0 - part
    inner = fused(left, quartic, rest)
    middle = fused(part, inner, bend)
    outer = fused(left, middle, growth)
    slope = fused(left, fused(-part, quartic, inner), -middle)
    return fused(part, outer, start), fused(part, slope, outer)
