"""[surface]: what a landing atom meets."""

from typing import Literal

from pydantic import Field, model_validator

from tracer.engine.runspec.adsorption import ColdTrapsTable, DesorptionTable
from tracer.engine.runspec.sticking import StickingLaw
from tracer.engine.runspec.temperature import TemperatureLaw
from tracer.inputs.number import Fraction
from tracer.inputs.table import Table, conflict


class SurfaceTable(Table):
    """The ground."""

    temperature: TemperatureLaw | None = Field(
        None,
        description="Temperature of the surface. Required where atoms bounce (`sticking` below 1), where `sticking` is "
        'a law, or where a release takes `temperature = "surface"`.',
    )
    sticking: StickingLaw = Field(
        0.0, description="Probability that a landing atom is adsorbed; the others bounce."
    )
    adsorbed: Literal["captured", "desorbed"] = Field(
        "captured",
        description="What becomes of adsorbed atoms: kept for good, or they leave again, see `desorption`, at the "
        "temperature of the place and by the cosine law.",
    )
    desorption: DesorptionTable | None = Field(
        None, description='Required with `adsorbed = "desorbed"`, and goes with it alone.'
    )
    accommodation: Fraction = Field(1.0, description="Energy accommodation of atoms that bounce.")
    cold_traps: ColdTrapsTable | None = Field(
        None, description="Places that capture what lands there, before anything else happens to it."
    )

    @model_validator(mode="after")
    def _desorbs_in_some_way(self) -> "SurfaceTable":
        if self.adsorbed == "desorbed" and self.desorption is None:
            raise conflict(
                "desorption",
                'missing; adsorbed is "desorbed"; write for example { energy = "0.29 eV", '
                'attempt_frequency = "1e13 s-1" }',
            )
        if self.adsorbed != "desorbed" and self.desorption is not None:
            raise conflict(
                "desorption", f'has no effect while adsorbed is "{self.adsorbed}"; must be "desorbed"'
            )
        return self
