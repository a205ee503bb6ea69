"""One flight from a stated launch to its end, point by point."""

from math import atan2, cos, degrees, hypot, pi, radians, sin
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from tracer.engine.kernel_world import kernel_world
from tracer.engine.scene import Scene
from tracer.errors import TracerError
from tracer.fate import Fate
from tracer.kernels.arc import highest
from tracer.kernels.arc_flight import arc_end, arc_state, launch_arc
from tracer.kernels.dense_output import FLOWN, LENGTH, START, hazards_at, place_at
from tracer.kernels.endings import AGED, CROSSED, FLYING, LANDED, STRUCK
from tracer.kernels.host import past_host
from tracer.kernels.integrated_flight import advance, new_curve, new_flight, start_flight
from tracer.kernels.motion import Sky
from tracer.kernels.orbit import body_on_orbit
from tracer.kernels.shadow import lit_fraction, shadow_behind, zone_at
from tracer.kernels.world import World
from tracer.tally.axes import direction

Floats = NDArray[np.float64]
Vector = tuple[float, ...]

ARC_POINTS = 201
"""Rows of the path along an arc, evenly spaced in the universal anomaly."""

STEP_POINTS = 4
"""Rows of the path for each step of an integrated flight."""

TOLERANCE = 1e-11
"""Of the integrator: one flight can afford more care than millions."""

LIT_COLUMN = 2

LANDED_WORD = "landed"
ENDINGS = {
    LANDED: LANDED_WORD,
    CROSSED: Fate.ESCAPED.label,
    AGED: Fate.AGE_LIMIT.label,
    STRUCK: Fate.OTHER_LOSS.label,
}

PATH_COLUMNS = ("time", "survival", "lit", "x", "y", "z", "vx", "vy", "vz")


class Launch(NamedTuple):
    """A launch from the ground: `latitude` [deg], `local_time` [h], `speed` [m s-1], the angles [deg].

    The velocity is that in the Sun-fixed frame; the ground's own motion is not added. `zenith_angle` counts from the
    local vertical, `azimuth` from north through east.
    """

    latitude: float
    local_time: float
    speed: float
    zenith_angle: float
    azimuth: float


class FlightSummary(NamedTuple):
    """How a flight went.

    `fate` is `landed` or a particle's end, `flight_time` [s], `apex_altitude` [m] the greatest height reached,
    `latitude` [deg] and `local_time` [h] of the end, `ground_arc` [deg] the angle that the flight sweeps about the
    body's centre.
    """

    fate: str
    flight_time: float
    apex_altitude: float
    latitude: float
    local_time: float
    ground_arc: float


class Flight(NamedTuple):
    """A flight's `path`, (n, 9) in the order of PATH_COLUMNS, and its `summary`."""

    path: Floats
    summary: FlightSummary


class Track(NamedTuple):
    """A flight as a propagator gives it: its `ending`, `path` in the order of PATH_COLUMNS, greatest distance [m]."""

    ending: int
    path: Floats
    greatest_distance: float


def fly(scene: Scene, launch: Launch) -> Flight:
    """Follow one atom from `launch` to landing, outer radius or age limit; a body that moves is at its stated position.

    Raises
    ------
    TracerError
        The propagator gave up.
    """
    world = kernel_world(scene)
    position, velocity = launch_state(launch, scene.body.radius)
    track = (_integrated_track if scene.integrated else _arc_track)(world, position, velocity)
    if track.ending not in ENDINGS:
        raise TracerError("the propagator gave up on this flight. This is a fault of the program")
    if scene.sun is not None:
        track.path[:, LIT_COLUMN] = _lit_fractions(world.light.conditions.sky, track.path)
    return Flight(track.path, _summary(track, scene.body.radius))


def _arc_track(world: World, position: Vector, velocity: Vector) -> Track:
    motion = world.motion
    arc = launch_arc(motion, *position, *velocity)
    ending, s_end = arc_end(motion, arc, motion.age_limit)
    states = np.array([arc_state(motion, arc, s) for s in np.linspace(0.0, s_end, ARC_POINTS)])
    time = states[:, 0]
    path = np.column_stack([time, np.exp(-motion.hazard * time), np.zeros(ARC_POINTS), states[:, 1:]])
    top = arc_state(motion, arc, highest(arc, s_end))[1:4]
    return Track(ending, path, float(np.linalg.norm(top)))


def _integrated_track(world: World, position: Vector, velocity: Vector) -> Track:
    conditions = world.light.conditions
    flight, curve = new_flight(), new_curve()
    start_flight(flight, conditions, TOLERANCE, *position, *velocity)
    rows = [(0.0, 1.0, 0.0, *position, *velocity)]
    top = float(np.linalg.norm(position))
    standing = FLYING
    while standing == FLYING:
        standing = advance(flight, curve, conditions, TOLERANCE, world.motion.age_limit)
        rows += [_row(curve, part) for part in np.linspace(0.0, curve[FLOWN], STEP_POINTS + 1)[1:]]
        top = max(top, _highest_in_step(curve))
    return Track(standing, np.array(rows), top)


def _row(curve: Floats, part: float) -> tuple[float, ...]:
    survival = float(np.exp(-sum(hazards_at(curve, part))))
    return (curve[START] + part * curve[LENGTH], survival, 0.0, *place_at(curve, part))


def _highest_in_step(curve: Floats) -> float:
    """Return the greatest distance [m] from the centre in the flown part of a step: at its end, or where it turns."""

    def climb(part: float) -> float:
        x, y, z, vx, vy, vz = place_at(curve, part)
        return float(x * vx + y * vy + z * vz)

    end = curve[FLOWN]
    if climb(0.0) > 0.0 > climb(end):
        end = brentq(climb, 0.0, end)
    return float(np.linalg.norm(place_at(curve, end)[:3]))


def _lit_fractions(sky: Sky, path: Floats) -> Floats:
    """Return the visible part of the Sun's disc along a path, past a body that moves as at each moment."""
    fractions = np.empty(len(path))
    for i, row in enumerate(path):
        place = tuple(map(float, row[3:6]))
        body = body_on_orbit(sky.forces, float(row[0]))
        shadow = shadow_behind(sky.shadow, body)
        own = lit_fraction(shadow, zone_at(shadow, *place), *place, body.distance)
        fractions[i] = past_host(body, own, *place)
    return fractions


def launch_state(launch: Launch, radius: float) -> tuple[Vector, Vector]:
    """Return position [m] and velocity [m s-1] of a launch in the Sun-fixed frame.

    North at a pole is the limit along the meridian of the given local time.
    """
    up = np.array(direction(launch.latitude, launch.local_time))
    theta, phi = radians(launch.latitude), (launch.local_time - 12.0) * pi / 12.0
    north = np.array([-sin(theta) * cos(phi), -sin(theta) * sin(phi), cos(theta)])
    east = np.array([-sin(phi), cos(phi), 0.0])
    zenith, azimuth = radians(launch.zenith_angle), radians(launch.azimuth)
    way = cos(zenith) * up + sin(zenith) * (cos(azimuth) * north + sin(azimuth) * east)
    return tuple(map(float, radius * up)), tuple(map(float, launch.speed * way))


def _summary(track: Track, radius: float) -> FlightSummary:
    path = track.path
    directions = path[:, 3:6] / np.linalg.norm(path[:, 3:6], axis=1)[:, np.newaxis]
    x, y, z = directions[-1]
    return FlightSummary(
        fate=ENDINGS[track.ending],
        flight_time=float(path[-1, 0]),
        apex_altitude=track.greatest_distance - radius,
        latitude=degrees(atan2(z, hypot(x, y))),
        local_time=(12.0 + atan2(y, x) * 12.0 / pi) % 24.0,
        ground_arc=degrees(_swept_angle(directions)),
    )


def _swept_angle(directions: Floats) -> float:
    """Return the angle [rad] along a path of unit vectors (n, 3); it may exceed half a turn."""
    across = np.linalg.norm(np.cross(directions[:-1], directions[1:]), axis=1)
    along = np.sum(directions[:-1] * directions[1:], axis=1)
    return float(np.sum(np.arctan2(across, along)))
