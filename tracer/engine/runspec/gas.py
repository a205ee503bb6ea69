"""[gas]: the species, its light and what removes it in flight."""

from typing import Literal

from pydantic import Field

from tracer.engine.runspec.spectral_line import SpectralLineTable
from tracer.inputs.quantity import AccelerationOrWord, LossRate, Mass
from tracer.inputs.table import Table
from tracer.inputs.text import Line


class LossTable(Table):
    """A loss in flight, exponential in time."""

    name: Line = Field(description="Name of the loss.")
    rate: LossRate = Field(
        description="Probability of loss per unit time; at 1 au where it scales with the distance."
    )
    scaling: Literal["inverse-square", "constant"] = Field(
        "constant",
        description='How the rate changes with the distance from the Sun; `"inverse-square"` needs `[sun]`.',
    )
    where: Literal["everywhere", "sunlight"] = Field(
        "everywhere",
        description='Where the loss acts; `"sunlight"`, in proportion to the visible part of the Sun, needs '
        "`[sun]`.",
    )


class GasTable(Table):
    """The gas that is traced."""

    species: Line = Field(description="A gas of the catalogue, or a name of your own with `mass`.")
    mass: Mass | None = Field(None, description="Mass of one atom or molecule. Default: the catalogue's.")
    photoionization_rate: LossRate | None = Field(
        None,
        description="Probability of ionisation by sunlight per unit time, at 1 au; 0 switches it off. "
        "Default: the catalogue's. Needs `[sun]` unless 0.",
    )
    radiation_acceleration: AccelerationOrWord | None = Field(
        None,
        description='Push by sunlight: `"lines"` by those with g, Doppler-shifted for each atom; a quantity, at '
        '1 au, as it is; `"none"`. Default: `"lines"` where lines with g are known, else `"none"`. '
        'Needs `[sun]` unless `"none"`.',
    )
    line: tuple[SpectralLineTable, ...] = Field(
        (), description="Emission lines of your own, any number. They need `[sun]`."
    )
    loss: tuple[LossTable, ...] = Field((), description="Losses in flight, any number.")
