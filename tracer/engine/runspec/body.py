"""[body]: what holds the gas."""

from typing import Literal

from pydantic import Field, model_validator

from tracer.inputs.number import Eccentricity
from tracer.inputs.quantity import Angle, GravitationalParameter, Length, RotationPeriod
from tracer.inputs.table import Table, conflict
from tracer.inputs.text import Line


class OrbitTable(Table):
    """An ellipse about the Sun; that of a moon of the catalogue is about its planet."""

    semi_major_axis: Length = Field(description="Semi-major axis of the ellipse.")
    eccentricity: Eccentricity = Field(description="Eccentricity of the ellipse.")


class HostTable(Table):
    """The planet that a moon goes about: its gravity, its shadow, and a sphere that ends flights.

    The moon moves on a circle in the plane of its host's orbit about the Sun. In `[sun]`, `true_anomaly` and `distance`
    are then the host's; the moon's own follow.
    """

    gm: GravitationalParameter | None = Field(
        None, description="Gravitational constant times mass of the host. Default: the catalogue's."
    )
    radius: Length | None = Field(None, description="Mean radius of the host. Default: the catalogue's.")
    distance: Length | None = Field(
        None, description="Distance of the moon from the host's centre. Default: the catalogue's."
    )
    period: RotationPeriod | None = Field(
        None,
        description="Sidereal period of the moon's orbit about the host, positive where prograde. Default: the "
        "catalogue's, else that of a circle by Kepler's third law, which any other must follow to 5 %.",
    )
    phase_angle: Angle | None = Field(
        None,
        description="Where the host stands, seen from the moon: from the Sun's direction, +x, towards +y. 0 deg: full "
        "moon seen from the host, in its shadow; 90 deg: last quarter; 180 deg: new moon; 270 deg: first quarter. "
        "Required, unless `sun.epoch` tells it.",
    )
    rotation: Literal["locked", "turning"] = Field(
        "locked",
        description="Whether the moon's ground keeps the same face to the host, or turns by `rotation_period`.",
    )


class BodyTable(Table):
    """The airless body; constants left out come from the catalogue."""

    name: Line = Field(
        description="A body of the catalogue, or the name of your own with the constants below."
    )
    radius: Length | None = Field(None, description="Mean radius. Default: the catalogue's.")
    gm: GravitationalParameter | None = Field(
        None,
        description="Gravitational constant times mass; 0 switches gravity off. Default: the catalogue's.",
    )
    rotation_period: RotationPeriod | None = Field(
        None, description="Sidereal rotation period, positive where prograde. Default: the catalogue's."
    )
    orbit: OrbitTable | None = Field(
        None, description="The body's orbit, or that of its `host`. Default: the catalogue's."
    )
    host: HostTable | None = Field(
        None, description="The planet that the body is a moon of. Without it no planet is near."
    )

    @model_validator(mode="after")
    def _turns_in_one_way(self) -> "BodyTable":
        if self.host is None:
            return self
        if self.host.rotation == "locked" and self.rotation_period is not None:
            raise conflict(
                "rotation_period",
                f'"{self.rotation_period}" stands beside host.rotation "locked", which is the host\'s period; must be '
                'left out, or host.rotation "turning"',
            )
        return self
