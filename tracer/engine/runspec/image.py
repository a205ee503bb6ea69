"""[[image]]: column-density images, resolved by velocity where that is asked for."""

import re

from pydantic import Field, model_validator

from tracer.engine.runspec.order import is_below
from tracer.inputs.number import Cells
from tracer.inputs.quantity import LineOfSightVelocity, SkyOffset
from tracer.inputs.sky import ViewerDirection
from tracer.inputs.table import Table, conflict
from tracer.inputs.text import Line


class VelocityTable(Table):
    """Velocity along the line of sight: positive away from the viewer, relative to the body, in axes that do not turn.

    What is slower or faster is not lost: it is kept apart.
    """

    from_: LineOfSightVelocity = Field(alias="from", description="Lower end; negative towards the viewer.")
    to: LineOfSightVelocity = Field(description="Upper end.")
    bins: Cells = Field(description="Equal bins between the two ends.")

    @model_validator(mode="after")
    def _rises(self) -> "VelocityTable":
        if not is_below(self.from_, self.to):
            raise conflict("to", f'"{self.to}" is not above from "{self.from_}"')
        return self


class ImageTable(Table):
    """One orthographic image of the gas, with what the body hides left out."""

    name: Line = Field(
        description="Name of the image; in the product in lower case, with `_` for all but a-z and digits."
    )
    look_from: ViewerDirection = Field(description="Where the viewer stands.")
    horizontal: tuple[SkyOffset, SkyOffset] = Field(
        description="Left and right edge, from the body's centre to the viewer's right."
    )
    vertical: tuple[SkyOffset, SkyOffset] = Field(
        description="Lower and upper edge, from the body's centre upwards: north, or dusk where the viewer "
        "stands above a pole."
    )
    pixels: tuple[Cells, Cells] = Field(description="Pixels along `horizontal` and `vertical`.")
    velocity: VelocityTable | None = Field(
        None, description="Resolve the image by velocity along the line of sight; left out: do not."
    )

    @model_validator(mode="after")
    def _has_an_area(self) -> "ImageTable":
        for axis, (low, high) in (("horizontal", self.horizontal), ("vertical", self.vertical)):
            if not is_below(low, high):
                raise conflict(axis, f'["{low}", "{high}"] has no width; the first must be below the second')
        return self


def product_name(name: str) -> str:
    """Return an image's name in the product: lower case, all but a-z, 0-9 and `_` replaced by `_`."""
    return re.sub(r"[^a-z0-9_]", "_", name.lower())
