"""Speed laws of a release."""

from typing import Annotated, Literal

from pydantic import Field, model_validator

from tracer.inputs.quantity import Energy, Speed, TemperatureOrSurface
from tracer.inputs.table import NAMED_LAW, Table, conflict
from tracer.inputs.text import FilePath
from tracer.units import si


class MaxwellFlux(Table):
    """Flux-weighted Maxwellian, probability density ~ v^3 exp(-m v^2 / 2kT): a surface in equilibrium."""

    law: Literal["maxwell-flux"] = "maxwell-flux"
    temperature: TemperatureOrSurface = Field(
        description='Temperature T; `"surface"` takes that of the surface at the place of launch.'
    )


class MaxwellGas(Table):
    """Maxwellian inside a gas, probability density ~ v^2 exp(-m v^2 / 2kT)."""

    law: Literal["maxwell-gas"] = "maxwell-gas"
    temperature: TemperatureOrSurface = Field(
        description='Temperature T; `"surface"` takes that of the surface at the place of launch.'
    )


class SingleSpeed(Table):
    """Every atom leaves at the same speed."""

    law: Literal["single"] = "single"
    speed: Speed = Field(description="The speed.")


class SigmundThompson(Table):
    """Sputtered atoms, probability density in energy ~ E/(E+U)^3 [1 - sqrt((E+U)/E_max)]."""

    law: Literal["sigmund-thompson"] = "sigmund-thompson"
    binding_energy: Energy = Field(description="Surface binding energy U.")
    cutoff_energy: Energy = Field(description="Largest energy E_max that a collision transfers; above U.")

    @model_validator(mode="after")
    def _leaves_energy_for_flight(self) -> "SigmundThompson":
        # Nearer to the binding energy the distribution cannot be told from rounding.
        if not si(self.cutoff_energy) > 1.0001 * si(self.binding_energy):
            raise conflict(
                "cutoff_energy",
                f'"{self.cutoff_energy}" is too low; must be above binding_energy "{self.binding_energy}"',
            )
        return self


class TabulatedSpeed(Table):
    """A distribution of your own."""

    law: Literal["table"] = "table"
    file: FilePath = Field(
        description="CSV of speed [m/s] and probability density of the flux, linear between its rows."
    )


SpeedLaw = Annotated[
    MaxwellFlux | MaxwellGas | SingleSpeed | SigmundThompson | TabulatedSpeed,
    Field(discriminator="law"),
    NAMED_LAW,
]
