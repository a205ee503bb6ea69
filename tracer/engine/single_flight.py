"""One flight from a stated launch to its end, point by point."""

from math import atan2, cos, degrees, hypot, pi, radians, sin
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.engine.kernel_world import kernel_world
from tracer.engine.scene import Scene
from tracer.errors import TracerError
from tracer.fate import Fate
from tracer.kernels.arc import highest
from tracer.kernels.arc_flight import AGED, CROSSED, LANDED, arc_end, arc_state, launch_arc
from tracer.tally.axes import direction

POINTS = 201
"""Rows of a flight's path, evenly spaced in the universal anomaly."""

LANDED_WORD = "landed"
ENDINGS = {LANDED: LANDED_WORD, CROSSED: Fate.ESCAPED.label, AGED: Fate.AGE_LIMIT.label}

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
    """A flight's `path`, (POINTS, 9) in the order of PATH_COLUMNS, and its `summary`."""

    path: NDArray[np.float64]
    summary: FlightSummary


def fly(scene: Scene, launch: Launch) -> Flight:
    """Follow one atom from `launch` to landing, outer radius or age limit.

    Raises
    ------
    TracerError
        The propagator gave up.
    """
    motion = kernel_world(scene).motion
    position, velocity = launch_state(launch, scene.body.radius)
    arc = launch_arc(motion, *position, *velocity)
    ending, s_end = arc_end(motion, arc, motion.age_limit)
    if ending not in ENDINGS:
        raise TracerError("the propagator gave up on this flight. This is a fault of the program")
    states = np.array([arc_state(motion, arc, s) for s in np.linspace(0.0, s_end, POINTS)])
    time = states[:, 0]
    path = np.column_stack([time, np.exp(-motion.hazard * time), np.zeros(POINTS), states[:, 1:]])
    top = arc_state(motion, arc, highest(arc, s_end))[1:4]
    return Flight(path, _summary(ENDINGS[ending], path, float(np.linalg.norm(top)) - scene.body.radius))


def launch_state(launch: Launch, radius: float) -> tuple[tuple[float, ...], tuple[float, ...]]:
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


def _summary(fate: str, path: NDArray[np.float64], apex_altitude: float) -> FlightSummary:
    directions = path[:, 3:6] / np.linalg.norm(path[:, 3:6], axis=1)[:, np.newaxis]
    x, y, z = directions[-1]
    return FlightSummary(
        fate=fate,
        flight_time=float(path[-1, 0]),
        apex_altitude=apex_altitude,
        latitude=degrees(atan2(z, hypot(x, y))),
        local_time=(12.0 + atan2(y, x) * 12.0 / pi) % 24.0,
        ground_arc=degrees(_swept_angle(directions)),
    )


def _swept_angle(directions: NDArray[np.float64]) -> float:
    """Return the angle [rad] along a path of unit vectors (n, 3); it may exceed half a turn."""
    across = np.linalg.norm(np.cross(directions[:-1], directions[1:]), axis=1)
    along = np.sum(directions[:-1] * directions[1:], axis=1)
    return float(np.sum(np.arctan2(across, along)))
