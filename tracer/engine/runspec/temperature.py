"""Temperature laws of the surface."""

from typing import Annotated, Literal

from pydantic import Field

from tracer.inputs.quantity import Temperature
from tracer.inputs.table import NAMED_LAW, Table


class UniformTemperature(Table):
    """The same temperature everywhere."""

    law: Literal["uniform"] = "uniform"
    value: Temperature = Field(description="The temperature.")


class QuarterPower(Table):
    """T = night + (subsolar - night) cos^(1/4) of the solar zenith angle by day, `night` by night."""

    law: Literal["quarter-power"] = "quarter-power"
    subsolar: Temperature = Field(description="Temperature where the Sun stands overhead.")
    night: Temperature = Field(description="Temperature of the night side.")


TemperatureLaw = Annotated[UniformTemperature | QuarterPower, Field(discriminator="law"), NAMED_LAW]
