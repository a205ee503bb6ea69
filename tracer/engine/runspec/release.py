"""[[release]]: how new atoms leave the surface."""

from typing import Literal

from pydantic import Field

from tracer.engine.runspec.direction import Cosine, DirectionLaw
from tracer.engine.runspec.place import PlaceLaw, Uniform
from tracer.engine.runspec.speed import SpeedLaw
from tracer.inputs.quantity import Rate
from tracer.inputs.table import Table
from tracer.inputs.text import Line


class ReleaseTable(Table):
    """One source of gas."""

    name: Line = Field(description="Name of the source, the label along the product's `release` dimension.")
    rate: Rate = Field(description="New atoms per second from the whole surface.")
    rate_scaling: Literal["constant", "inverse-square"] = Field(
        "constant",
        description='How the rate follows the distance from the Sun where `sun.motion = "moving"`: it is `rate` at the '
        "stated position.",
    )
    speed: SpeedLaw = Field(description="Distribution of launch speeds.")
    direction: DirectionLaw = Field(Cosine(), description="Distribution of launch directions.")
    place: PlaceLaw = Field(Uniform(), description="Distribution over the surface.")
