"""[spectrometer]: the instrument and its limits."""

from pydantic import Field, model_validator

from tracer.inputs.number import Count
from tracer.inputs.quantity import AltitudeEnd, Angle, Duration
from tracer.inputs.table import Table, conflict
from tracer.inputs.text import FilePath, Line
from tracer.observe.planspec.fields import (
    Area,
    CountRate,
    Counts,
    FieldAngle,
    KeepOutAngle,
    Samples,
    SomeCounts,
    Throughput,
)
from tracer.units import Quantity


class FieldOfView(Table):
    """A rectangular field of view; its height runs away from the body, or as the quaternions tell."""

    width: FieldAngle = Field(description="Full angle along the width.")
    height: FieldAngle = Field(description="Full angle along the height.")
    roll: Angle = Field(
        Quantity(0.0, "deg"),
        description="Turn of the field about the look direction, from height towards width.",
    )
    samples: tuple[Samples, Samples] = Field(
        (3, 3), description="Lines of sight along width and height; each stands for its part of the field."
    )


class BandLine(Table):
    """A line that the spectrometer counts."""

    name: Line = Field(description="An emission line of the product.")
    throughput: Throughput = Field(
        description="Counts per photon that enters the collecting area: optics times detector, at this line."
    )


class ScatteredSunlight(Table):
    """Sunlight that the instrument scatters into its band, by the angle of the Sun from the look direction."""

    file: FilePath = Field(
        description="CSV or ECSV of `sun_angle_deg`, rising, and `rate_per_s`, counts per second where the body is; "
        "linear between rows, held beyond the ends."
    )


class SpectrometerTable(Table):
    """The instrument: what it collects, its noise, and its limits."""

    collecting_area: Area = Field(description="Area that collects light.")
    field_of_view: FieldOfView = Field(description="What it sees at once.")
    line: tuple[BandLine, ...] = Field(description="Lines in its band, one or more; their counts add up.")
    dark_rate: CountRate = Field(Quantity(0.0, "s-1"), description="Counts per second without light.")
    background_rate: CountRate = Field(
        Quantity(0.0, "s-1"), description="Counts per second of background light, the same everywhere."
    )
    scattered_sunlight: ScatteredSunlight | None = Field(
        None, description="Counts of scattered sunlight. Default: none."
    )
    read_noise: Counts = Field(0.0, description="Noise of one read, in counts, standard deviation.")
    reads: Count = Field(1, description="Reads, or pixels, that add their noise to one exposure.")
    exposure: Duration = Field(description="Length of one exposure.")
    full_well: SomeCounts | None = Field(None, description="Counts at which an exposure saturates.")
    sun_keep_out: KeepOutAngle = Field(
        description="No part of the field of view may come nearer to the Sun's centre than this."
    )
    body_keep_out: AltitudeEnd | None = Field(
        None,
        description="No part of the field of view may pass the body below this altitude. Default: no limit.",
    )
    wanted_snr: SomeCounts = Field(10.0, description="Signal-to-noise ratio for which an exposure is asked.")

    @model_validator(mode="after")
    def _counts_each_line_once(self) -> "SpectrometerTable":
        if not self.line:
            raise conflict("line", "missing; must be at least one table, headed [[spectrometer.line]]")
        known: dict[str, int] = {}
        for number, entry in enumerate(self.line, 1):
            if (first := known.setdefault(entry.name, number)) != number:
                raise conflict(f"line[{number}].name", f'"{entry.name}" is already the name of line[{first}]')
        return self
