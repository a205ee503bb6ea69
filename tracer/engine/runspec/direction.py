"""Direction laws of a release."""

from typing import Annotated, Literal

from pydantic import Field

from tracer.inputs.number import Exponent
from tracer.inputs.table import NAMED_LAW, Table


class Cosine(Table):
    """Flux per solid angle ~ cos^power of the zenith angle."""

    law: Literal["cosine"] = "cosine"
    power: Exponent = Field(1.0, description="Power of the cosine; 1 is a surface in equilibrium.")


class Isotropic(Table):
    """The same flux into every direction above the horizon."""

    law: Literal["isotropic"] = "isotropic"


class Normal(Table):
    """Straight up."""

    law: Literal["normal"] = "normal"


DirectionLaw = Annotated[Cosine | Isotropic | Normal, Field(discriminator="law"), NAMED_LAW]
