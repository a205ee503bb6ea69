"""Where the points of a profile lie in the sky, and the rectangles over which they are means."""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.inputs.sky import SkyPoint
from tracer.observe.observationspec.observation import ObservationSpec
from tracer.observe.observationspec.view import SlitTable, ViewTable
from tracer.observe.pointing import SIDES
from tracer.tally.axes import VIEWERS, direction, make_image_plane
from tracer.units import RADII, Quantity, conversion_factor, si

Floats = NDArray[np.float64]

NO_DIRECTION = 1e-3
"""Sine of the angle to the line of sight below which a direction cannot be told in the sky."""

FWHM_OF_GAUSSIAN = 2.0 * math.sqrt(2.0 * math.log(2.0))


class View(NamedTuple):
    """Unit vectors in the Sun-fixed frame: to the viewer, and to his right and upwards; and `words` for them."""

    toward_viewer: Floats
    right: Floats
    up: Floats
    words: str


class Scale(NamedTuple):
    """What turns lengths in the sky into metres: `radius` of the body, and `distance` of the observer, if known [m].

    `file` names the observation file in messages.
    """

    radius: float
    distance: float | None
    file: str


class Aperture(NamedTuple):
    """Rectangle over which a point is a mean: `length` along `angle` [rad] from the viewer's right, `width` across."""

    length: float
    width: float
    angle: float


class Spread(NamedTuple):
    """Seeing: `fwhm` [m]; `beta` of a Moffat function, None for a Gaussian."""

    fwhm: float
    beta: float | None


class Track(NamedTuple):
    """N points in the sky: rightwards `h` and upwards `v` (N,) [m], and the `angle` [rad] at which the profile runs."""

    h: Floats
    v: Floats
    angle: float


def view_of(given: ViewTable) -> View:
    """Return the directions of a viewer."""
    if given.phase_angle is not None:
        phase, aside = math.radians(si(given.phase_angle)), SIDES[given.side]
        toward = tuple(math.cos(phase) * (i == 0) + math.sin(phase) * aside[i] for i in range(3))
        words = f"at phase angle {given.phase_angle} on the {given.side} side"
    elif isinstance(given.look_from, SkyPoint):
        toward = direction(si(given.look_from.latitude), given.look_from.local_time)
        words = f"from latitude {given.look_from.latitude}, local time {given.look_from.local_time:g} h"
    else:
        toward = VIEWERS[str(given.look_from)]
        words = f"from {given.look_from}"
    plane = make_image_plane(
        "view", "view", (toward[0], toward[1], toward[2]), (-1.0, 1.0), (-1.0, 1.0), (1, 1)
    )
    return View(np.array(plane.toward_viewer), np.array(plane.right), np.array(plane.up), words)


def metres(quantity: Quantity, scale: Scale) -> float:
    """Return a length in the sky [m]; an angle is one at the observer's distance.

    Raises
    ------
    InputError
        An angle without a distance.
    """
    return quantity.value * metres_in(quantity.unit, scale)


def metres_in(unit: str, scale: Scale) -> float:
    """Return how many metres in the sky one of `unit` is; errors as `metres`."""
    if unit == RADII:
        return scale.radius
    length = conversion_factor(unit, "m")
    if length is not None:
        return length
    angle = conversion_factor(unit, "rad")
    if angle is None:
        raise InputError(f'{scale.file}: "{unit}" is no unit of length or angle')
    if scale.distance is None:
        raise InputError(
            f'{scale.file}: view.distance: missing; the angle in "{unit}" needs it to become a length'
        )
    return angle * scale.distance


def track_of(spec: ObservationSpec, view: View, scale: Scale, positions: Floats) -> Track:
    """Return where the points of a profile at `positions` [m] lie.

    Raises
    ------
    InputError
        An axis that the viewer looks along.
    """
    given = spec.profile
    if given.along == "slit":
        assert given.direction is not None
        angle = math.radians(si(given.direction))
        start = (0.0, 0.0) if given.through is None else tuple(metres(one, scale) for one in given.through)
        return _line(start[0], start[1], angle, positions)
    if given.along == "altitude":
        assert given.side is not None
        x, y = _in_sky(SIDES[given.side], view, f"{spec.file}: profile.side", f"the {given.side} side")
        return _line(0.0, 0.0, math.atan2(y, x), scale.radius + positions)
    x, y = _in_sky((-1.0, 0.0, 0.0), view, f"{spec.file}: profile.along", "the tail's axis")
    offset = metres(given.offset, scale)
    return _line(-offset * y, offset * x, math.atan2(y, x), positions)


def aperture_of(slit: SlitTable | None, scale: Scale, profile_angle: float) -> Aperture | None:
    """Return the rectangle of a slit for a profile that runs at `profile_angle` [rad]; None without a slit."""
    if slit is None:
        return None
    turn = {"along": 0.0, "across": 0.5 * math.pi}.get(str(slit.orientation))
    if turn is None:
        assert isinstance(slit.orientation, Quantity)
        turn = math.radians(si(slit.orientation))
    return Aperture(metres(slit.length, scale), metres(slit.width, scale), profile_angle + turn)


def spread_of(spec: ObservationSpec, scale: Scale) -> Spread | None:
    """Return the seeing of an observation file; None without."""
    if spec.seeing is None:
        return None
    return Spread(metres(spec.seeing.fwhm, scale), spec.seeing.beta)


def _line(h: float, v: float, angle: float, positions: Floats) -> Track:
    return Track(h + positions * math.cos(angle), v + positions * math.sin(angle), angle)


def _in_sky(vector: tuple[float, float, float], view: View, key: str, what: str) -> tuple[float, float]:
    x, y = float(view.right @ np.array(vector)), float(view.up @ np.array(vector))
    length = math.hypot(x, y)
    if length < NO_DIRECTION:
        raise InputError(f"{key}: the viewer looks along {what}, which has no direction in the sky")
    return x / length, y / length
