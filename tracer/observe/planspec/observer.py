"""[observer]: where the observer is at what times."""

from typing import Annotated, Literal

from pydantic import Field, model_validator

from tracer.inputs.quantity import Duration
from tracer.inputs.table import Table, conflict
from tracer.inputs.text import FilePath, Line
from tracer.observe.planspec.fields import Vector


class TablePath(Table):
    """A CSV or ECSV table of `time`, `observer_x_km`, `observer_y_km`, `observer_z_km` from the body's centre."""

    law: Literal["table"] = "table"
    file: FilePath = Field(
        description="The table; `time` is a number of seconds or a date, and rises. One exposure begins at each row."
    )
    frame: Literal["sun-fixed", "inertial"] = Field(
        "sun-fixed",
        description="Axes of positions and directions: +x to the Sun and +z north, or axes that do not turn; the table "
        "then has `sun_x_km`, `sun_y_km`, `sun_z_km` as well, from the body to the Sun.",
    )
    inertial_frame: Line | None = Field(
        None, description='Name of the inertial frame, for example `"ICRF"`; required with `"inertial"`.'
    )
    orbit_normal: Vector | None = Field(
        None,
        description="Direction of the body's orbit normal, north, in the inertial frame, of any length; required with "
        '`"inertial"`.',
    )

    @model_validator(mode="after")
    def _says_what_its_axes_are(self) -> "TablePath":
        for key in ("inertial_frame", "orbit_normal"):
            given = getattr(self, key) is not None
            if given and self.frame == "sun-fixed":
                raise conflict(key, 'goes with frame = "inertial" alone')
            if not given and self.frame == "inertial":
                raise conflict(key, 'missing; frame = "inertial" needs it')
        if self.orbit_normal is not None and not any(self.orbit_normal):
            raise conflict("orbit_normal", "[0, 0, 0] has no length; must be a direction")
        return self


class SpicePath(Table):
    """SPICE kernels of the user's own, read with `spiceypy` (extra `spice`)."""

    law: Literal["spice"] = "spice"
    kernels: tuple[FilePath, ...] = Field(
        description="Kernel files: an SPK with observer, body and Sun, a leapseconds kernel, frames as needed."
    )
    observer: Line = Field(description="Name or number of the observer in the kernels.")
    target: Line = Field(description="Name or number of the body in the kernels, the one of the product.")
    host: Line | None = Field(
        None,
        description="Name or number of the planet that a moon goes about: north is that of its orbit about the Sun.",
    )
    sun: Line = Field("SUN", description="Name or number of the Sun in the kernels.")
    frame: Line = Field(
        "J2000", description="Frame of the directions in `[pointing]`, by its name in the kernels."
    )
    start: Line = Field(description="Begin of the first exposure, UTC, as SPICE reads times.")
    stop: Line = Field(description="No exposure begins later, UTC.")
    step: Duration = Field(description="From the beginning of an exposure to the next.")

    @model_validator(mode="after")
    def _has_kernels(self) -> "SpicePath":
        if not self.kernels:
            raise conflict("kernels", "[] is empty; must be a list of kernel files")
        return self


ObserverPath = Annotated[TablePath | SpicePath, Field(discriminator="law")]
