"""[ensemble.stop]: run until a number is known well enough."""

from pydantic import Field, model_validator

from tracer.engine.runspec.order import is_below
from tracer.inputs.number import HourOfDay, RelativeError, SeveralOf
from tracer.inputs.quantity import AltitudeEnd, Latitude, SkyOffset
from tracer.inputs.table import Table, conflict
from tracer.inputs.text import Line


class RegionTable(Table):
    """Cells whose middle lies inside all the given ends; without any, all cells and all releases."""

    altitude: tuple[AltitudeEnd, AltitudeEnd] | None = Field(None, description="Lower and upper end.")
    latitude: tuple[Latitude, Latitude] | None = Field(None, description="Southern and northern end.")
    local_time: tuple[HourOfDay, HourOfDay] | None = Field(
        None, description="From and to; `[18, 6]` is the night."
    )
    horizontal: tuple[SkyOffset, SkyOffset] | None = Field(
        None, description="Left and right end, for a variable of an image."
    )
    vertical: tuple[SkyOffset, SkyOffset] | None = Field(
        None, description="Lower and upper end, for a variable of an image."
    )
    release: Line | None = Field(None, description="One release; without it, the sum over all.")
    line: Line | None = Field(None, description="The emission line, for a variable that has lines.")

    @model_validator(mode="after")
    def _has_an_inside(self) -> "RegionTable":
        for axis in ("altitude", "latitude", "horizontal", "vertical"):
            ends = getattr(self, axis)
            if ends is not None and not is_below(*ends):
                raise conflict(
                    axis, f'["{ends[0]}", "{ends[1]}"] is no range; the first must be below the second'
                )
        if self.local_time is not None and self.local_time[0] == self.local_time[1]:
            raise conflict(
                "local_time", f"[{self.local_time[0]:g}, {self.local_time[1]:g}] is no range; must differ"
            )
        return self


class StopTable(Table):
    """Stop at 20, 40, 80, 160, ... batches, as soon as the mean over a region is known well enough."""

    variable: Line = Field(
        description="A tallied variable of the product over cells or pixels, for example `number_density` or "
        "`column_<image>`."
    )
    region: RegionTable = Field(
        RegionTable(), description="Where: the mean is weighted with the cells' volume or area."
    )
    relative_error: RelativeError = Field(description="Standard error of that mean over the mean.")
    at_most_batches: SeveralOf = Field(
        description="Batches at which the run ends in any case; `batches` does not count then."
    )
