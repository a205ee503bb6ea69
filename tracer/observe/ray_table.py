"""A table of rays, as lines of sight."""

import numpy as np
from astropy.table import Table

from tracer.errors import InputError
from tracer.observe.sights import (
    GROUND_ROUNDING,
    Floats,
    Sights,
    length,
    place_at,
    sights_through,
    unit,
)
from tracer.observe.tables import check_times, has_columns, numbers, vectors

KILOMETRE = 1e3
OBSERVER = ("observer_x_km", "observer_y_km", "observer_z_km")
LOOK = ("look_x", "look_y", "look_z")
TANGENT = ("tangent_altitude_km", "tangent_latitude_deg", "tangent_local_time_h")
LARGEST = 1e15
"""Coordinates [km] beyond this are no place in a planetary system; squares of metres stay finite."""


def sights_of(table: Table, radius: float) -> Sights:
    """Return the lines of sight of a table of rays about a body of `radius` [m].

    `observer_x_km`, `observer_y_km`, `observer_z_km` in the Sun-fixed frame, with `look_x`, `look_y`, `look_z` of any
    length, or with `tangent_altitude_km`, `tangent_latitude_deg`, `tangent_local_time_h` (see `sights_through`).

    Raises
    ------
    InputError
        A missing column, an entry that is no number, an observer inside the body, a direction without length, or
        times that fall; with row and column.
    """
    if has_columns(table, LOOK) and has_columns(table, TANGENT):
        raise InputError(
            f"columns {', '.join(LOOK)} and {', '.join(TANGENT)}: both are given; must be one of the two"
        )
    check_times(table, strictly=False)
    observers = KILOMETRE * np.stack([numbers(table, name, -LARGEST, LARGEST) for name in OBSERVER], axis=1)
    refuse_inside(observers, radius, f"columns {', '.join(OBSERVER)}", "the observer")
    if has_columns(table, TANGENT):
        return _through_tangents(table, observers, radius)
    if not has_columns(table, LOOK):
        raise InputError(
            f"columns {', '.join(LOOK)}, or {', '.join(TANGENT)}: missing; the table has {', '.join(table.colnames)}"
        )
    look = unit(vectors(table, LOOK))
    _refuse_lengthless(look, f"columns {', '.join(LOOK)}: the look vector has no length")
    return Sights(observers, look)


def refuse_inside(places: Floats, radius: float, columns: str, what: str) -> None:
    """Raise InputError where one of `places` (N, 3) [m] lies inside the body of `radius` [m]."""
    height = length(places) - radius
    inside = height < -GROUND_ROUNDING * radius
    if inside.any():
        row = int(np.argmax(inside))
        raise InputError(
            f"row {row + 1}, {columns}: {what} is inside the body, {-height[row] / KILOMETRE:g} km below the "
            f"ground; must be at least {radius / KILOMETRE:g} km from the centre"
        )


def _through_tangents(table: Table, observers: Floats, radius: float) -> Sights:
    altitude = numbers(table, TANGENT[0], -LARGEST, LARGEST) * KILOMETRE
    latitude = numbers(table, TANGENT[1], -90.0, 90.0)
    local_time = numbers(table, TANGENT[2], 0.0, 24.0)
    deep = altitude <= -radius
    if deep.any():
        row = int(np.argmax(deep))
        raise InputError(
            f"row {row + 1}, column {TANGENT[0]}: {altitude[row] / KILOMETRE:g} is not allowed; must be above "
            f"{-radius / KILOMETRE:g}, the centre"
        )
    sights = sights_through(observers, place_at(altitude, latitude, local_time, radius))
    _refuse_lengthless(
        sights.look,
        f"columns {', '.join(TANGENT)}: the tangent point lies straight below or above the observer, which gives no "
        "direction",
    )
    refuse_inside(sights.start, radius, f"columns {', '.join(TANGENT)}", "the start of the ray")
    return sights


def _refuse_lengthless(look: Floats, reason: str) -> None:
    without = length(look) == 0.0
    if without.any():
        raise InputError(f"row {int(np.argmax(without)) + 1}, {reason}")
