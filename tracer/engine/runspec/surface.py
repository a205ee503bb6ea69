"""[surface]: what a landing atom meets."""

from typing import Literal

from pydantic import Field

from tracer.engine.runspec.temperature import TemperatureLaw
from tracer.inputs.number import Fraction
from tracer.inputs.table import Table


class SurfaceTable(Table):
    """The ground."""

    temperature: TemperatureLaw | None = Field(
        None,
        description="Temperature of the surface. Required where atoms bounce (`sticking` below 1) or where a "
        'release takes `temperature = "surface"`.',
    )
    sticking: Fraction = Field(
        0.0, description="Probability that a landing atom is adsorbed; the others bounce."
    )
    adsorbed: Literal["captured"] = Field(
        "captured", description="What becomes of adsorbed atoms: kept for good."
    )
    accommodation: Fraction = Field(1.0, description="Energy accommodation of atoms that bounce.")
