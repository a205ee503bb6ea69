"""[domain]: where and when a particle's life is cut."""

from pydantic import Field, model_validator

from tracer.inputs.quantity import Duration, LengthOrRadii
from tracer.inputs.table import Table, conflict
from tracer.units import RADII, Quantity


class DomainTable(Table):
    """Limits in space and time."""

    outer_radius: LengthOrRadii | None = Field(
        None,
        description="Distance from the centre; crossing it outwards is escape, bound or not. Default: the "
        "Hill radius, of a moon with a host about the host; required for a body without an orbit.",
    )
    age_limit: Duration = Field(Quantity(1.0, "yr"), description="Longest life of a particle.")

    @model_validator(mode="after")
    def _lies_above_the_ground(self) -> "DomainTable":
        outer = self.outer_radius
        if outer is not None and outer.unit == RADII and outer.value <= 1.0:
            raise conflict("outer_radius", f'"{outer}" is not above the ground; must be above 1 radii')
        return self
