"""Lines of sight about a body: where each starts, looks, comes nearest and ends.

Sun-fixed frame: origin in the body's centre, +x to the Sun, +z north, +y dusk; local time 12 h + atan2(y, x) 12 h/pi.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.kernels.rays import Paths

Floats = NDArray[np.float64]

GROUND_ROUNDING = 1e-12
"""Part of the radius by which an observer, or a line of sight that grazes, may lie below the ground as rounding."""
FAR_ROUNDING = 1e-15
"""Part of the distance to the observer that rounding takes from a tangent point."""


class Sights(NamedTuple):
    """N lines of sight: `start` (N, 3) [m] from the body's centre, `look` (N, 3) unit vectors."""

    start: Floats
    look: Floats


class Geometry(NamedTuple):
    """Where N lines of sight come nearest to the centre, and where the Sun stands; angles in degrees, shape (N,).

    `tangent_altitude` [m] is negative where the body blocks the line, which then ends at the ground (`ends_at_body`).
    An observer who looks away from the body is nearest himself. `tangent_local_time` in hours, `solar_zenith_angle` at
    the tangent point, `sun_angle` between the look direction and the Sun as the observer sees it.
    """

    tangent_altitude: Floats
    tangent_latitude: Floats
    tangent_local_time: Floats
    solar_zenith_angle: Floats
    sun_angle: Floats
    ends_at_body: NDArray[np.bool_]


def length(vectors: Floats) -> Floats:
    """Return the lengths (N,) of vectors (N, 3), without overflow for any that a table can hold."""
    return np.asarray(np.hypot(np.hypot(vectors[:, 0], vectors[:, 1]), vectors[:, 2]))


def unit(vectors: Floats) -> Floats:
    """Return vectors (N, 3) of length 1; a vector of length 0 stays."""
    # Twice: the first division brings tiny and huge vectors to where squares keep their digits.
    for _ in range(2):
        norm = length(vectors)[:, None]
        vectors = np.divide(vectors, norm, out=np.zeros_like(vectors), where=norm > 0.0)
    return vectors


def dot(a: Floats, b: Floats) -> Floats:
    """Return the scalar products (N,) of vectors (N, 3)."""
    return np.asarray(np.einsum("ij,ij->i", a, b))


def angle_between(a: Floats, b: Floats) -> Floats:
    """Return the angle [deg] between vectors (N, 3), exact for small and for flat angles alike."""
    a, b = unit(a), unit(b)
    return np.asarray(np.degrees(2.0 * np.arctan2(length(a - b), length(a + b))))


def toward_the_sun(places: Floats, sun_distance: float | None) -> Floats:
    """Return vectors (N, 3) from `places` (N, 3) [m] to the Sun on +x; None stands for a Sun without end."""
    if sun_distance is None:
        return np.broadcast_to(np.array([1.0, 0.0, 0.0]), places.shape)
    return np.array([sun_distance, 0.0, 0.0]) - places


def latitude_of(places: Floats) -> Floats:
    """Return the latitude [deg] of places (N, 3)."""
    return np.asarray(np.degrees(np.arctan2(places[:, 2], np.hypot(places[:, 0], places[:, 1]))))


def local_time_of(places: Floats) -> Floats:
    """Return the local time [h], in [0, 24), of places (N, 3)."""
    hours = 12.0 + np.arctan2(places[:, 1], places[:, 0]) * 12.0 / np.pi
    return np.asarray(np.where(hours >= 24.0, 0.0, hours))


def place_at(altitude: Floats, latitude: Floats, local_time: Floats, radius: float) -> Floats:
    """Return places (N, 3) [m] at altitudes [m] over `radius`, latitudes [deg] and local times [h]."""
    theta, phi = np.radians(latitude), (local_time - 12.0) * np.pi / 12.0
    out = np.stack([np.cos(theta) * np.cos(phi), np.cos(theta) * np.sin(phi), np.sin(theta)], axis=1)
    return np.asarray((radius + altitude)[:, None] * out)


def sights_through(observers: Floats, tangents: Floats) -> Sights:
    """Return the lines of sight that have their nearest points to the centre at `tangents` (N, 3) [m].

    The direction is the component of tangent - observer perpendicular to the tangent point, and the line starts at the
    tangent point minus its length. Where there is no such component `look` has length 0.
    """
    out = unit(tangents)
    way = tangents - observers
    way = way - dot(way, out)[:, None] * out
    # What is left of an observer straight above the tangent point is rounding.
    way[length(way) <= 1e-12 * (length(tangents) + length(observers))] = 0.0
    return Sights(tangents - way, unit(way))


def paths_of(sights: Sights, radius: float) -> tuple[Paths, NDArray[np.bool_]]:
    """Return the sights as kernels take them, and which of them end at the body of `radius` [m]."""
    start = dot(sights.start, sights.look)
    nearest = sights.start - start[:, None] * sights.look
    # Once more: for a far observer the first subtraction leaves rounding along the line.
    rest = dot(nearest, sights.look)
    nearest, start = nearest - rest[:, None] * sights.look, start + rest
    rho = length(nearest)
    ground = radius * (1.0 - GROUND_ROUNDING) - FAR_ROUNDING * np.abs(start)
    blocked = (start < 0.0) & (rho < ground)
    depth = np.sqrt(np.where(blocked, (radius - rho) * (radius + rho), 0.0))
    end = np.where(blocked, np.maximum(start, -depth), np.inf)
    contiguous = (np.ascontiguousarray(part, dtype=np.float64) for part in (nearest, sights.look, start, end))
    return Paths(*contiguous), blocked


def geometry(sights: Sights, radius: float, sun_distance: float | None) -> Geometry:
    """Return the geometry of lines of sight about a body of `radius` [m].

    `sun_distance` [m] of the body; None where it is not known, and the Sun then counts as infinitely far.
    """
    paths, blocked = paths_of(sights, radius)
    away = paths.start > 0.0
    nearest = np.where(away[:, None], sights.start, paths.nearest)
    return Geometry(
        tangent_altitude=length(nearest) - radius,
        tangent_latitude=latitude_of(nearest),
        tangent_local_time=local_time_of(nearest),
        solar_zenith_angle=angle_between(nearest, toward_the_sun(nearest, sun_distance)),
        sun_angle=angle_between(sights.look, toward_the_sun(sights.start, sun_distance)),
        ends_at_body=blocked,
    )


def share_outside(sights: Sights, radius: float, top: float, outer: float) -> Floats:
    """Return the part (N,) of each path through traced space that lies outside the grid.

    Traced space is the sphere of `outer` radius [m] in which atoms were followed, the grid that of `top` radius [m]; a
    path ends at the ground. A line that misses traced space is outside as a whole.
    """
    paths, _ = paths_of(sights, radius)
    traced, covered = (_inside(paths, max(limit, top)) for limit in (outer, top))
    return np.asarray(np.where(traced > 0.0, 1.0 - covered / np.where(traced > 0.0, traced, 1.0), 1.0))


def _inside(paths: Paths, limit: float) -> Floats:
    rho = length(paths.nearest)
    reach = np.sqrt(np.maximum(0.0, (limit - rho) * (limit + rho)))
    return np.asarray(np.maximum(0.0, np.minimum(paths.end, reach) - np.maximum(paths.start, -reach)))
