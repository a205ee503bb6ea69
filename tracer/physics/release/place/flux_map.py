"""Release by a map of the flux."""

from typing import NamedTuple

import numpy as np

from tracer.kernels.places import places_in_cells
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
        even_rows, even_columns = np.ascontiguousarray(u.T)
        return np.asarray(
            places_in_cells(self.sines, self.hours, self.rows, self.columns, even_rows, even_columns)
        )


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
