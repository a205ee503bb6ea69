"""Where an instrument points along its path, and what its field of view covers."""

import math
from typing import NamedTuple

import numpy as np
from astropy.table import Table

from tracer.errors import InputError
from tracer.observe.path import ObserverPath
from tracer.observe.planspec.plan import PlanSpec
from tracer.observe.planspec.pointing import (
    AltitudeScan,
    FixedDirection,
    TablePointing,
    TailSweep,
    TangentAltitude,
)
from tracer.observe.planspec.spectrometer import FieldOfView
from tracer.observe.ray_table import KILOMETRE, LOOK
from tracer.observe.sights import Floats, dot, length, unit
from tracer.observe.tables import has_columns, vectors
from tracer.units import si

QUATERNION = ("quaternion_w", "quaternion_x", "quaternion_y", "quaternion_z")

SIDES = {
    "dawn": (0.0, -1.0, 0.0),
    "dusk": (0.0, 1.0, 0.0),
    "north": (0.0, 0.0, 1.0),
    "south": (0.0, 0.0, -1.0),
    "sunward": (1.0, 0.0, 0.0),
    "tailward": (-1.0, 0.0, 0.0),
}

STRAIGHT_OVER = 1e-9
"""Sine of an angle that is rounding: the observer stands over the middle of a side."""


class Attitude(NamedTuple):
    """N attitudes in the Sun-fixed frame: unit vectors (N, 3) along the look, the field's height and its width."""

    look: Floats
    height: Floats
    width: Floats


def attitude(plan: PlanSpec, path: ObserverPath, radius: float) -> Attitude:
    """Return how the instrument stands at every place of the path, about a body of `radius` [m].

    Raises
    ------
    InputError
        A direction that cannot be looked into from there, or columns of the path's table that cannot be used.
    """
    given, places = plan.pointing, path.places
    if isinstance(given, TablePointing):
        if path.table is None:
            raise InputError(f'{plan.file}: pointing.law: "table" needs observer.law = "table"')
        return _from_table(plan, given, path, path.table)
    if isinstance(given, FixedDirection):
        look = np.einsum("nij,j->ni", path.turns, np.array(given.direction))
    elif isinstance(given, TailSweep):
        ends = [si(end, radius) for end in given.downtail]
        targets = np.zeros_like(places)
        targets[:, 0] = -_stepping(ends, given.steps, len(places))
        look = targets - places
    else:
        look = _limb(plan, given, places, radius)
    look = unit(look)
    if np.any(length(look) == 0.0):
        row = int(np.argmin(length(look)))
        raise InputError(f"{plan.file}: pointing: at exposure {row + 1} the observer is where he is to look")
    return _upright(look, places)


def _limb(plan: PlanSpec, given: TangentAltitude | AltitudeScan, places: Floats, radius: float) -> Floats:
    """Return the directions that touch the sphere of the tangent altitude on the given side."""
    if isinstance(given, TangentAltitude):
        altitudes = np.full(len(places), si(given.altitude, radius))
    else:
        altitudes = _stepping([si(end, radius) for end in given.altitude], given.steps, len(places))
    distance, rho = length(places), radius + altitudes
    out = unit(places)
    aside = np.broadcast_to(np.array(SIDES[given.side]), places.shape)
    aside = aside - dot(aside, out)[:, None] * out
    # What rounding leaves of nothing has no direction.
    aside[length(aside) < STRAIGHT_OVER] = 0.0
    aside = unit(aside)
    for wrong, reason in (
        (distance <= rho, "is not above that tangent altitude"),
        (length(aside) == 0.0, f"stands straight over the {given.side} side, which has no limb for him"),
    ):
        if wrong.any():
            row = int(np.argmax(wrong))
            raise InputError(
                f"{plan.file}: pointing: at exposure {row + 1} the observer, "
                f"{(distance[row] - radius) / KILOMETRE:.6g} km high, {reason} ({altitudes[row] / KILOMETRE:.6g} km)"
            )
    # cos = rho/distance at the centre between observer and tangent point.
    cosine = (rho / distance)[:, None]
    sine = np.sqrt((1.0 - cosine) * (1.0 + cosine))
    return np.asarray(rho[:, None] * (cosine * out + sine * aside) - places)


def _stepping(ends: list[float], steps: int, count: int) -> Floats:
    share = (np.arange(count) % steps) / (steps - 1)
    return np.asarray(ends[0] * (1.0 - share) + ends[1] * share)


def _from_table(plan: PlanSpec, given: TablePointing, path: ObserverPath, table: Table) -> Attitude:
    try:
        if has_columns(table, QUATERNION):
            return _from_quaternions(given, path, vectors(table, QUATERNION))
        look = unit(vectors(table, LOOK))
        without = length(look) == 0.0
        if without.any():
            row = int(np.argmax(without)) + 1
            raise InputError(f"row {row}, columns {', '.join(LOOK)}: the look vector has no length")
    except InputError as error:
        file = getattr(plan.observer, "file", "table")
        raise InputError(f"{plan.folder / file}: {error}") from None
    return _upright(np.einsum("nij,nj->ni", path.turns, look), path.places)


def _from_quaternions(given: TablePointing, path: ObserverPath, quaternions: Floats) -> Attitude:
    norms = np.sqrt(np.sum(quaternions**2, axis=1))
    if np.any(np.abs(norms - 1.0) > 1e-3):
        row = int(np.argmax(np.abs(norms - 1.0) > 1e-3))
        raise InputError(
            f"row {row + 1}, columns {', '.join(QUATERNION)}: their length is {norms[row]:.6g}; must be 1 to 0.001"
        )
    turns = path.turns @ rotations(quaternions / norms[:, None])
    look = unit(turns @ np.array(given.boresight))
    upward = turns @ np.array(given.upward)
    height = unit(upward - dot(upward, look)[:, None] * look)
    return Attitude(look, height, np.cross(look, height))


def rotations(quaternions: Floats) -> Floats:
    """Return the matrices (N, 3, 3) that turn vectors as unit quaternions (N, 4), scalar first, do: v' = q v q*."""
    w, x, y, z = quaternions.T
    return np.stack(
        [
            np.stack([1 - 2 * (y * y + z * z), 2 * (x * y - w * z), 2 * (x * z + w * y)], axis=1),
            np.stack([2 * (x * y + w * z), 1 - 2 * (x * x + z * z), 2 * (y * z - w * x)], axis=1),
            np.stack([2 * (x * z - w * y), 2 * (y * z + w * x), 1 - 2 * (x * x + y * y)], axis=1),
        ],
        axis=1,
    )


def _upright(look: Floats, places: Floats) -> Attitude:
    """Return attitudes whose height runs away from the body: along the tangent point's vertical.

    Straight towards the body or away from it there is no such direction, and height runs north; or to the Sun.
    """
    height = np.zeros_like(look)
    north, sunward = (np.broadcast_to(axis, look.shape) for axis in ([0.0, 0.0, 1.0], [1.0, 0.0, 0.0]))
    for up in (unit(places), north, sunward):
        across = up - dot(up, look)[:, None] * look
        missing = length(height) == 0.0
        height = np.where((missing & (length(across) > 1e-6))[:, None], unit(across), height)
    return Attitude(look, height, np.cross(look, height))


class Samples(NamedTuple):
    """M directions in a field of view, as tangents of angles along width and height, with `solid_angles` [sr]."""

    across: Floats
    along: Floats
    solid_angles: Floats


def field_samples(field: FieldOfView) -> Samples:
    """Return directions in the middles of equal parts of a rectangular field, and the exact solid angle of each part.

    The field is the pyramid between four planes through the observer; its part between 0 and the tangents X and Y has
    the solid angle atan(XY/sqrt(1 + X^2 + Y^2)).
    """
    edges = [
        _edges(si(size), count)
        for size, count in zip((field.width, field.height), field.samples, strict=True)
    ]
    x, y = (np.tan(edge) for edge in edges)
    corner = np.arctan(x[:, None] * y / np.sqrt(1.0 + x[:, None] ** 2 + y**2))
    parts = np.diff(np.diff(corner, axis=0), axis=1)
    middles = [np.tan(0.5 * (edge[1:] + edge[:-1])) for edge in edges]
    across, along = np.meshgrid(*middles, indexing="ij")
    return Samples(across.ravel(), along.ravel(), parts.ravel())


def directions(stand: Attitude, samples: Samples, roll: float) -> Floats:
    """Return the unit vectors (N, M, 3) of samples of the field of view, turned by `roll` [deg]."""
    height, width = rolled(stand, roll)
    rays = (
        stand.look[:, None, :]
        + samples.across[:, None] * width[:, None, :]
        + samples.along[:, None] * height[:, None, :]
    )
    return np.asarray(rays / np.sqrt(np.sum(rays**2, axis=2, keepdims=True)))


def rolled(stand: Attitude, roll: float) -> tuple[Floats, Floats]:
    """Return the field's height and width (N, 3) after its turn by `roll` [deg], from height towards width."""
    c, s = math.cos(math.radians(roll)), math.sin(math.radians(roll))
    return c * stand.height + s * stand.width, c * stand.width - s * stand.height


def _edges(size: float, count: int) -> Floats:
    return math.radians(size) * (np.arange(count + 1) / count - 0.5)
