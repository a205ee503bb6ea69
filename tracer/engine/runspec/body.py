"""[body]: what holds the gas."""

from pydantic import Field

from tracer.inputs.number import Eccentricity
from tracer.inputs.quantity import GravitationalParameter, Length, RotationPeriod
from tracer.inputs.table import Table
from tracer.inputs.text import Line


class OrbitTable(Table):
    """An ellipse about the Sun; that of a moon of the catalogue is about its planet."""

    semi_major_axis: Length = Field(description="Semi-major axis of the ellipse.")
    eccentricity: Eccentricity = Field(description="Eccentricity of the ellipse.")


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
    orbit: OrbitTable | None = Field(None, description="The body's orbit. Default: the catalogue's.")
