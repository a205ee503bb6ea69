"""An accepted step as a curve: where the atom is, how fast, and its hazards, at any time within the step.

The curve is float64 (CURVE_SIZE,): start time [s] and length [s] of the full step, the part of it that was
flown before ground, outer sphere, shadow edge or age limit cut it, the zone of the shadow, then five
coefficients of each of x, y, z, vx, vy, vz and the ionising and the other hazard, as Hairer, Norsett & Wanner
(1993), II.6, write them; at the end the series (see `orbit`) of the body's distance, where the body moves, and
its host's phase.
"""

from tracer.kernels.compiling import inlined, merged
from tracer.kernels.orbit import SERIES_SIZE

START = 0
LENGTH = 1
FLOWN = 2
CURVE_ZONE = 3
COEFFICIENTS = 4
SERIES = 44
CURVE_SIZE = SERIES + SERIES_SIZE


@merged
def set_component(curve, component, start, growth, h, first_slope, last_slope, quartic):
    """Store one component's coefficients from its `start`, `growth` over the step and slopes at both ends."""
    k = COEFFICIENTS + 5 * component
    bend = h * first_slope - growth
    curve[k] = start
    curve[k + 1] = growth
    curve[k + 2] = bend
    curve[k + 3] = growth - h * last_slope - bend
    curve[k + 4] = quartic


@merged
def component_at(curve, component, part):
    """Return a component (0-2 x, y, z [m], 3-5 velocity [m s-1], 6 ionising, 7 other hazard) at `part` of the step."""
    k = COEFFICIENTS + 5 * component
    rest = 1.0 - part
    bend = curve[k + 2] + part * (curve[k + 3] + rest * curve[k + 4])
    return curve[k] + part * (curve[k + 1] + rest * bend)


@inlined
def place_at(curve, part):
    """Return (x, y, z, vx, vy, vz) at `part` (0 to 1) of the step."""
    return (
        component_at(curve, 0, part),
        component_at(curve, 1, part),
        component_at(curve, 2, part),
        component_at(curve, 3, part),
        component_at(curve, 4, part),
        component_at(curve, 5, part),
    )


@inlined
def hazards_at(curve, part):
    """Return (ionising, other) hazard since launch at `part` (0 to 1) of the step."""
    return component_at(curve, 6, part), component_at(curve, 7, part)
