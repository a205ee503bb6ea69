"""Limits of an instrument along its path: Sun, body, counts, and what the product cannot tell."""

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tracer.observe.field_light import Light
from tracer.observe.optical_depth import THICK
from tracer.observe.planspec.spectrometer import FieldOfView, SpectrometerTable
from tracer.observe.pointing import Attitude, rolled
from tracer.observe.sights import Floats, angle_between, length
from tracer.units import si

Flags = dict[str, NDArray[Any]]

MUCH_OUTSIDE = 0.1
"""Part of a column that may be missing above the grid's top before a row is flagged."""


def limit_flags(
    places: Floats, suns: Floats, stand: Attitude, light: Light, instrument: SpectrometerTable, radius: float
) -> Flags:
    """Return which exposures touch a limit, truth values (N,).

    Parameters
    ----------
    places, suns : ndarray, shape (N, 3)
        The observer from the body's centre, and the Sun from the observer [m].
    stand : Attitude
        How the instrument stands.
    light : Light
        What it sees.
    instrument : SpectrometerTable
        Its field of view and limits.
    radius : float
        Radius of the body [m].
    """
    field = instrument.field_of_view
    distance, aside = length(places), least_angle(stand, field, -places)
    # Nearest to the body's centre, a line of sight passes it at the sine of the angle; one that looks away does not.
    passes = aside < 90.0
    lowest = np.where(passes, distance * np.sin(np.radians(aside)) - radius, distance - radius)
    keep_out = -math.inf if instrument.body_keep_out is None else si(instrument.body_keep_out, radius)
    return {
        "sun_keep_out": least_angle(stand, field, suns) <= si(instrument.sun_keep_out),
        "body_keep_out": passes & (lowest < keep_out),
        "body_in_field": passes & (lowest < 0.0),
        "outside_grid": light.missing > MUCH_OUTSIDE,
        "thick": light.depth > THICK,
    }


def least_angle(stand: Attitude, field: FieldOfView, targets: Floats) -> Floats:
    """Return the angle [deg] between each target (N, 3) and what of the field of view is nearest to it; 0 inside.

    The field's edges are arcs of great circles: the nearest point of one is the target's projection on its plane, where
    that lies between the corners, or a corner.
    """
    height, width = rolled(stand, si(field.roll))
    local = np.stack([np.einsum("ni,ni->n", targets, axis) for axis in (stand.look, width, height)], axis=1)
    w, h = (math.tan(math.radians(0.5 * si(size))) for size in (field.width, field.height))
    inside = _within(local, 1, w) & _within(local, 2, h)
    angles = []
    for side in (-1.0, 1.0):
        for other in (-1.0, 1.0):
            angles.append(angle_between(np.broadcast_to([1.0, side * w, other * h], local.shape), local))
        for axis, size, across, limit in ((1, w, 2, h), (2, h, 1, w)):
            normal = np.zeros(3)
            normal[0], normal[axis] = -side * size, 1.0
            normal /= math.hypot(1.0, size)
            foot = local - (local @ normal)[:, None] * normal
            angles.append(np.where(_within(foot, across, limit), angle_between(foot, local), math.inf))
    return np.asarray(np.where(inside, 0.0, np.min(angles, axis=0)))


def _within(vectors: Floats, axis: int, tangent: float) -> NDArray[np.bool_]:
    """Return whether vectors (N, 3) of (ahead, across, along) lie ahead, within a tangent to both sides of an axis."""
    return np.asarray((vectors[:, 0] > 0.0) & (np.abs(vectors[:, axis]) <= tangent * vectors[:, 0]))
