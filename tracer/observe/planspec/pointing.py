"""[pointing]: where the instrument looks."""

from typing import Annotated, Literal

from pydantic import Field, model_validator

from tracer.inputs.quantity import AltitudeEnd, SkyOffset
from tracer.inputs.table import NAMED_LAW, Table, conflict
from tracer.observe.planspec.fields import Side, Steps, Vector

SIDE_WORDS = "On which side of the body, as seen by the observer, the line of sight passes."


class FixedDirection(Table):
    """The same direction throughout, in the axes of the observer's table or the SPICE frame."""

    law: Literal["direction"] = "direction"
    direction: Vector = Field(description="Look direction, of any length.")

    @model_validator(mode="after")
    def _has_a_length(self) -> "FixedDirection":
        if not any(self.direction):
            raise conflict("direction", "[0, 0, 0] has no length; must be a direction")
        return self


class TangentAltitude(Table):
    """The limb at a fixed tangent altitude."""

    law: Literal["tangent-altitude"] = "tangent-altitude"
    altitude: AltitudeEnd = Field(description="Altitude of the tangent point; below the observer's own.")
    side: Side = Field(description=SIDE_WORDS)


class AltitudeScan(Table):
    """The limb, with tangent altitudes that step from exposure to exposure and begin again after the last."""

    law: Literal["altitude-scan"] = "altitude-scan"
    altitude: tuple[AltitudeEnd, AltitudeEnd] = Field(description="First and last tangent altitude.")
    steps: Steps = Field(description="Exposures in a scan.")
    side: Side = Field(description=SIDE_WORDS)


class TailSweep(Table):
    """Points on the tail's axis behind the body, stepping from exposure to exposure; again after the last."""

    law: Literal["tail-sweep"] = "tail-sweep"
    downtail: tuple[SkyOffset, SkyOffset] = Field(
        description="First and last distance behind the body's centre, away from the Sun."
    )
    steps: Steps = Field(description="Exposures in a sweep.")


class TablePointing(Table):
    """Columns of the observer's table, in its axes: `look_x`, `look_y`, `look_z`; or a quaternion.

    `quaternion_w`, `quaternion_x`, `quaternion_y`, `quaternion_z` turn the instrument's axes into those of the table.
    """

    law: Literal["table"] = "table"
    boresight: Vector = Field(
        (0.0, 0.0, 1.0), description="Look direction in the instrument's axes, for quaternions."
    )
    upward: Vector = Field(
        (0.0, 1.0, 0.0),
        description="Direction in the instrument's axes along which the field's height runs, for quaternions.",
    )

    @model_validator(mode="after")
    def _has_two_directions(self) -> "TablePointing":
        a, b = self.boresight, self.upward
        across = (a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0])
        if not any(across):
            raise conflict("upward", f"{list(b)} lies along boresight {list(a)}; must be another direction")
        return self


Pointing = Annotated[
    FixedDirection | TangentAltitude | AltitudeScan | TailSweep | TablePointing,
    Field(discriminator="law"),
    NAMED_LAW,
]
