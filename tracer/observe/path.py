"""Where the observer is: from a table or from SPICE kernels, in the Sun-fixed frame."""

from typing import Any, NamedTuple

import numpy as np
from astropy.table import Table
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.observe.planspec.observer import TablePath
from tracer.observe.planspec.plan import PlanSpec
from tracer.observe.ray_table import KILOMETRE, LARGEST, OBSERVER, refuse_inside
from tracer.observe.sights import Floats, dot, length, unit
from tracer.observe.spice_path import spice_states
from tracer.observe.tables import check_times, column_values, numbers, read_table

SUN = ("sun_x_km", "sun_y_km", "sun_z_km")


class ObserverPath(NamedTuple):
    """N places of an observer.

    `times` as they were given (N,); `places` (N, 3) [m] in the Sun-fixed frame; `turns` (N, 3, 3) from the axes in
    which directions are given to the Sun-fixed frame; `sun_distances` (N,) [m] of the body, None where the path does
    not tell; `table` with further columns, None for SPICE.
    """

    times: NDArray[Any]
    places: Floats
    turns: Floats
    sun_distances: Floats | None
    table: Table | None


def observer_path(plan: PlanSpec, radius: float) -> ObserverPath:
    """Return the path of a plan's observer about a body of `radius` [m].

    Raises
    ------
    InputError
        The table or the kernels cannot be used; the message names the file, and the row and column of a table.
    """
    if not isinstance(plan.observer, TablePath):
        states = spice_states(plan, plan.observer)
        to_fixed = sun_fixed_axes(states.suns, states.normals)
        places = _turned(to_fixed, states.observers)
        refuse_inside(places, radius, f"positions from the kernels of {plan.file}", "the observer")
        return ObserverPath(states.times, places, to_fixed @ states.from_frame, length(states.suns), None)
    name = str(plan.folder / plan.observer.file)
    table = read_table(name)
    try:
        return _from_table(table, plan.observer, radius)
    except InputError as error:
        raise InputError(f"{name}: {error}") from None


def _from_table(table: Table, given: TablePath, radius: float) -> ObserverPath:
    if "time" not in table.colnames:
        raise InputError(f"column time: missing; the table has {', '.join(table.colnames)}")
    check_times(table, strictly=True)
    places = _vectors(table, OBSERVER)
    refuse_inside(places, radius, f"columns {', '.join(OBSERVER)}", "the observer")
    turns, distances = np.broadcast_to(np.eye(3), (len(table), 3, 3)), None
    if given.orbit_normal is not None:
        suns = _vectors(table, SUN)
        distances = length(suns)
        if not np.all(distances > radius):
            row = int(np.argmin(distances))
            raise InputError(f"row {row + 1}, columns {', '.join(SUN)}: the Sun is inside the body")
        turns = sun_fixed_axes(suns, np.broadcast_to(np.array(given.orbit_normal), suns.shape))
        places = _turned(turns, places)
    return ObserverPath(column_values(table["time"]), places, turns, distances, table)


def sun_fixed_axes(suns: Floats, normals: Floats) -> Floats:
    """Return the rotations (N, 3, 3) into the Sun-fixed frame.

    Rows are +x along `suns` (N, 3), from the body to the Sun, +z along the part of the orbit's `normals` (N, 3)
    perpendicular to it, and +y, which completes.

    Raises
    ------
    InputError
        A normal along the direction to the Sun, with its row.
    """
    x = unit(suns)
    normals = unit(normals)
    across = normals - dot(normals, x)[:, None] * x
    flat = length(across) < 1e-6
    if flat.any():
        raise InputError(
            f"row {int(np.argmax(flat)) + 1}: the orbit normal lies along the direction to the Sun; it must be "
            "perpendicular to the orbit"
        )
    z = unit(across)
    return np.stack([x, np.cross(z, x), z], axis=1)


def _turned(turns: Floats, vectors: Floats) -> Floats:
    return np.asarray(np.einsum("nij,nj->ni", turns, vectors))


def _vectors(table: Table, names: tuple[str, str, str]) -> Floats:
    return KILOMETRE * np.stack([numbers(table, name, -LARGEST, LARGEST) for name in names], axis=1)
