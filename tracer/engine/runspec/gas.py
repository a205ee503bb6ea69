"""[gas]: the species and what removes it in flight."""

from typing import Literal

from pydantic import Field

from tracer.engine.runspec.quantity import LossRate, Mass
from tracer.engine.runspec.table import Table
from tracer.engine.runspec.text import Line


class LossTable(Table):
    """A loss in flight, exponential in time."""

    name: Line = Field(description="Name of the loss.")
    rate: LossRate = Field(description="Probability of loss per unit time.")
    scaling: Literal["constant"] = Field(
        "constant", description="How the rate changes with the distance from the Sun."
    )
    where: Literal["everywhere"] = Field("everywhere", description="Where the loss acts.")


class GasTable(Table):
    """The gas that is traced."""

    species: Line = Field(description="A gas of the catalogue, or a name of your own with `mass`.")
    mass: Mass | None = Field(None, description="Mass of one atom or molecule. Default: the catalogue's.")
    loss: tuple[LossTable, ...] = Field((), description="Losses in flight, any number.")
