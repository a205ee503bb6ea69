"""[grid]: the cells of the density grid."""

from pydantic import Field, model_validator

from tracer.engine.runspec.order import is_below
from tracer.inputs.number import Cells
from tracer.inputs.quantity import LengthOrRadii
from tracer.inputs.table import Table, conflict
from tracer.units import Quantity


class AltitudeTable(Table):
    """Altitude edges: 0, then `cells` edges evenly spaced in log altitude from `first_cell` to `top`."""

    first_cell: LengthOrRadii = Field(
        Quantity(10.0, "km"), description="Top of the lowest cell, an altitude."
    )
    top: LengthOrRadii = Field(Quantity(10.0, "radii"), description="Top of the grid, an altitude.")
    cells: Cells = Field(50, description="Number of cells.")

    @model_validator(mode="after")
    def _rises(self) -> "AltitudeTable":
        if not is_below(self.first_cell, self.top):
            raise conflict("top", f'"{self.top}" is too low; must be above first_cell "{self.first_cell}"')
        return self


class GridTable(Table):
    """Cells in altitude, latitude and local time."""

    altitude: AltitudeTable = Field(AltitudeTable(), description="Cells in altitude.")
    latitude_cells: Cells = Field(36, description="Cells in latitude, of equal angle.")
    local_time_cells: Cells = Field(48, description="Cells in local time, of equal length from 0 h.")
