"""Temperature laws of the surface."""

from typing import Annotated, Literal

from pydantic import Field

from tracer.engine.runspec.number import Emissivity, Fraction
from tracer.engine.runspec.quantity import Temperature
from tracer.engine.runspec.table import NAMED_LAW, Table
from tracer.engine.runspec.text import FilePath, Line


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


TemperatureLaw = Annotated[
    UniformTemperature | QuarterPower | EquilibriumTemperature | Hurley2015 | TemperatureMap,
    Field(discriminator="law"),
    NAMED_LAW,
]
