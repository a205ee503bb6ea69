"""Release by a map of the flux."""

from typing import NamedTuple

import numpy as np

from tracer.kernels.surface_map import HOURS_A_TURN, SurfaceMap
from tracer.physics.release.laws import Floats


class FluxMap(NamedTuple):
    """Flux is even within each cell of a map; cells of L latitudes and H local times cover the sphere.

    `sines` (L + 1,) of the latitude edges, `hours` (H + 1,) the local-time edges [h] over one turn; `rows` (L + 1,) the
    share of all atoms that leave south of an edge, `columns` (L, H + 1) the share of a row's that leave before one.
    """

    sines: Floats
    hours: Floats
    rows: Floats
    columns: Floats

    def places(self, u: Floats) -> Floats:
        """Return unit vectors by inverting first the latitude's and then the row's distribution; see `PlaceLaw`."""
        row = np.searchsorted(self.rows, u[:, 0], side="right") - 1
        z = _inside(self.rows, self.sines, row, u[:, 0])
        hour = np.empty_like(z)
        for i in np.unique(row):
            here = row == i
            column = np.searchsorted(self.columns[i], u[here, 1], side="right") - 1
            hour[here] = _inside(self.columns[i], self.hours, column, u[here, 1])
        across, phi = np.sqrt(np.maximum(0.0, 1.0 - z * z)), (hour - 12.0) * (np.pi / 12.0)
        return np.column_stack([across * np.cos(phi), across * np.sin(phi), z])


def flux_map(table: SurfaceMap) -> FluxMap:
    """Return the place law of a map of relative flux per area, not negative and not 0 everywhere."""
    latitudes, local_times = table.latitudes, table.local_times
    inner = np.sin(np.radians(0.5 * (latitudes[1:] + latitudes[:-1])))
    sines = np.concatenate(([-1.0], inner, [1.0]))
    around = np.concatenate(([local_times[-1] - HOURS_A_TURN], local_times, [local_times[0] + HOURS_A_TURN]))
    hours = 0.5 * (around[1:] + around[:-1])
    # Divided first: fluxes of any size, in any unit, must not overflow in the sums.
    in_cells = table.values / table.values.max() * np.diff(hours)
    rows = _shares(in_cells.sum(axis=1) * np.diff(sines))
    return FluxMap(sines, hours, rows, np.array([_shares(cells) for cells in in_cells]))


def _shares(parts: Floats) -> Floats:
    """Return the running sum of `parts` from 0 to 1 exactly; all 0 where there is nothing."""
    sums = np.concatenate(([0.0], np.cumsum(parts)))
    return sums / sums[-1] if sums[-1] > 0.0 else sums


def _inside(
    shares: Floats, edges: Floats, cell: "np.ndarray[tuple[int], np.dtype[np.intp]]", u: Floats
) -> Floats:
    """Return the place between the edges of `cell` that the share `u` of all atoms has left before."""
    part = (u - shares[cell]) / (shares[cell + 1] - shares[cell])
    return np.asarray(edges[cell] + part * (edges[cell + 1] - edges[cell]))
