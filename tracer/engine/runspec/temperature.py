"""Temperature laws of the surface."""

from typing import Annotated, Literal

from pydantic import Field, model_validator

from tracer.inputs.number import Albedo, Emissivity, Fraction
from tracer.inputs.quantity import (
    Conductivity,
    HeatCapacity,
    Length,
    MassDensity,
    Temperature,
    ThermalInertia,
)
from tracer.inputs.table import NAMED_LAW, Table, conflict
from tracer.inputs.text import FilePath, Line


class UniformTemperature(Table):
    """The same temperature everywhere."""

    law: Literal["uniform"] = "uniform"
    value: Temperature = Field(description="The temperature.")


class QuarterPower(Table):
    """T = night + (subsolar - night) cos^(1/4) of the solar zenith angle by day, `night` by night."""

    law: Literal["quarter-power"] = "quarter-power"
    subsolar: Temperature = Field(description="Temperature where the Sun stands overhead.")
    night: Temperature = Field(description="Temperature of the night side.")


class EquilibriumTemperature(Table):
    """Ground that radiates what it absorbs, sigma emissivity T^4 = (1 - albedo) S cos(solar zenith angle) / d^2."""

    law: Literal["equilibrium"] = "equilibrium"
    albedo: Fraction = Field(description="Bond albedo: the share of sunlight that is not absorbed.")
    emissivity: Emissivity = Field(0.95, description="Thermal emissivity.")
    night: Temperature = Field(
        description="Temperature of the night side, below which it is nowhere. The law needs `[sun]`."
    )


class Hurley2015(Table):
    """The Moon: a fit to observed temperatures, day and night (Hurley et al. 2015)."""

    law: Literal["hurley-2015"] = "hurley-2015"


class TemperatureMap(Table):
    """A map of your own, linear between the middles of its cells."""

    law: Literal["map"] = "map"
    file: FilePath = Field(
        description="netCDF file with the coordinates `latitude` [deg] and `local_time` [h], the middles of cells that "
        "cover the sphere."
    )
    variable: Line = Field(description="Its variable over `latitude` and `local_time`, in kelvin.")


class Conduction(Table):
    """Ground that conducts heat down and radiates, in the periodic steady state under the mean motion of the Sun."""

    law: Literal["conduction"] = "conduction"
    thermal_inertia: ThermalInertia | None = Field(
        None,
        description="Square root of conductivity times density times heat capacity; either this or all three are "
        "needed.",
    )
    conductivity: Conductivity | None = Field(None, description="Thermal conductivity.")
    density: MassDensity | None = Field(None, description="Mass density of the ground.")
    heat_capacity: HeatCapacity | None = Field(None, description="Specific heat capacity.")
    albedo: Albedo = Field(description="Bond albedo: the share of sunlight that is not absorbed.")
    emissivity: Emissivity = Field(0.95, description="Thermal emissivity.")
    distance: Length | None = Field(
        None,
        description="Distance from the Sun at which the ground is lit. Default: where sunlight is that of "
        "the orbit in the mean over time, without an orbit that of `[sun]`; needed are `[sun]` and a rotation period.",
    )

    @model_validator(mode="after")
    def _knows_how_heat_flows(self) -> "Conduction":
        parts = {name: getattr(self, name) for name in ("conductivity", "density", "heat_capacity")}
        given = [name for name, value in parts.items() if value is not None]
        if self.thermal_inertia is not None:
            if given:
                raise conflict(
                    given[0],
                    f'"{parts[given[0]]}" stands beside thermal_inertia "{self.thermal_inertia}"; must be one of the '
                    "two",
                )
            return self
        if not given:
            raise conflict(
                "thermal_inertia",
                "missing; either this or conductivity, density and heat_capacity are needed; write for example "
                '"50 J m-2 K-1 s-1/2"',
            )
        for name, value in parts.items():
            if value is None:
                raise conflict(
                    name, f"missing; needed beside {' and '.join(given)}, or thermal_inertia in their place"
                )
        return self


TemperatureLaw = Annotated[
    UniformTemperature | QuarterPower | EquilibriumTemperature | Hurley2015 | TemperatureMap | Conduction,
    Field(discriminator="law"),
    NAMED_LAW,
]
