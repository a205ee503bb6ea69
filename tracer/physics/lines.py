"""g-values of resonance lines against heliocentric radial velocity, and the push they give.

g_l(v) = (pi e^2 / m c^2) lambda^2 f F at the wavelength lambda (1 - v/c), photons per second scattered by one
atom in the lower level at 1 au; each photon pushes by h / (m lambda).
"""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from tracer.catalogue.light_records import Line, ResidualFlux
from tracer.constants import PLANCK
from tracer.kernels.lines import flat_tables

Floats = npt.NDArray[np.float64]

FINEST_STEP = 1.0
"""Step [m s-1] to which the knots of an uneven table are rounded so that they fall on an even grid."""

TELLURIC_OFFSETS = {"na_d2": (-0.354e-10, -0.256e-10)}
"""Offsets [m] between which a line of the Earth's air lowers the residual flux (header of the data file)."""


class VelocityTable(NamedTuple):
    """g of one line at 1 au [s-1] at evenly spaced heliocentric radial velocities [m s-1], rising.

    `wavelength` is the vacuum wavelength [m]. A single value stands for all velocities.
    """

    name: str
    wavelength: float
    first_velocity: float
    velocity_step: float
    g: Floats


def catalogue_table(line: Line) -> VelocityTable | None:
    """Return the g of a catalogue line, None where it is not known; the residual flux goes before a g table."""
    if line.residual_flux is not None and line.continuum_g is not None:
        flux = _bridged(line.name, line.residual_flux)
        velocities = np.array([line.velocity_of_offset(offset) for offset in line.residual_flux.offset])
        return table_of(line.name, line.wavelength, velocities[::-1], line.continuum_g * flux[::-1])
    if line.g is not None:
        return table_of(line.name, line.wavelength, np.array(line.g.velocity), np.array(line.g.g))
    return None


def constant_table(name: str, wavelength: float, g: float) -> VelocityTable:
    """Return a line of vacuum `wavelength` [m] whose `g` [s-1] at 1 au is the same at all velocities."""
    return VelocityTable(name, wavelength, 0.0, 1.0, np.array([g]))


def table_of(name: str, wavelength: float, velocities: Floats, g: Floats) -> VelocityTable:
    """Return a line with `g` [s-1] at 1 au at rising `velocities` [m s-1], linear between them.

    Uneven knots are put on the grid of their greatest common step, after rounding to whole metres per second.

    Raises
    ------
    ValueError
        If there are fewer than two knots, they don't rise by more than 1 m/s each, or a value is negative or
        not finite.
    """
    _check(velocities, g)
    steps = np.diff(velocities)
    step = (velocities[-1] - velocities[0]) / steps.size
    # An even table keeps its own knots: rounding those of the residual flux would shift the line.
    if np.all(np.abs(steps - step) <= 1e-6 * step):
        return VelocityTable(
            name, wavelength, float(velocities[0]), float(step), np.array(g, dtype=np.float64)
        )
    whole = np.rint(velocities / FINEST_STEP).astype(np.int64)
    common = int(np.gcd.reduce(np.diff(whole)))
    grid = np.arange(whole[0], whole[-1] + common, common) * FINEST_STEP
    return VelocityTable(
        name, wavelength, float(grid[0]), common * FINEST_STEP, np.interp(grid, whole * FINEST_STEP, g)
    )


def table_value(table: VelocityTable, velocity: npt.ArrayLike) -> Floats:
    """Return g [s-1] at 1 au at `velocity` [m s-1], any shape; end values are held beyond the table's ends."""
    knots = table.first_velocity + table.velocity_step * np.arange(table.g.size)
    return np.asarray(np.interp(np.asarray(velocity, dtype=np.float64), knots, table.g))


def line_tables(tables: Sequence[VelocityTable]) -> Floats:
    """Return the g of `tables` at 1 au [s-1] as kernels take them."""
    return flat_tables(
        [table.first_velocity for table in tables],
        [table.velocity_step for table in tables],
        [table.g for table in tables],
    )


def push_tables(tables: Sequence[VelocityTable], mass: float) -> Floats:
    """Return the acceleration [m s-2] at 1 au that all lines give an atom of `mass` [kg], as kernels take it.

    Lines whose knots are the same share a table: only the sum of all tables has a meaning.
    """
    shared: dict[tuple[float, float, int], Floats] = {}
    for table in tables:
        knots = (table.first_velocity, table.velocity_step, table.g.size)
        push = table.g * (PLANCK / (mass * table.wavelength))
        shared[knots] = shared[knots] + push if knots in shared else push
    return flat_tables([knots[0] for knots in shared], [knots[1] for knots in shared], list(shared.values()))


def line_acceleration(tables: Sequence[VelocityTable], mass: float, velocity: npt.ArrayLike) -> Floats:
    """Return the acceleration [m s-2] at 1 au of an atom of `mass` [kg] at `velocity` [m s-1], away from the Sun."""
    total = np.zeros(np.shape(velocity))
    for table in tables:
        total = total + table_value(table, velocity) * PLANCK / (mass * table.wavelength)
    return total


def _bridged(name: str, residual: ResidualFlux) -> Floats:
    """Return the residual flux, drawn straight across what the Earth's air took out."""
    offset, flux = np.array(residual.offset), np.array(residual.flux)
    if name not in TELLURIC_OFFSETS:
        return flux
    low, high = TELLURIC_OFFSETS[name]
    lowered = (offset > low) & (offset < high)
    return np.where(lowered, np.interp(offset, offset[~lowered], flux[~lowered]), flux)


def _check(velocities: Floats, g: Floats) -> None:
    if velocities.size < 2 or velocities.shape != g.shape:
        raise ValueError("a table of g needs at least two velocities, and one g for each")
    if not (np.all(np.isfinite(velocities)) and np.all(np.isfinite(g)) and np.all(g >= 0.0)):
        raise ValueError("velocities must be finite, and g finite and not negative")
    if not np.all(np.diff(velocities) > FINEST_STEP):
        raise ValueError("velocities must rise from row to row by more than 1 m/s")
