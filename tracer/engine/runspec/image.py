"""[[image]]: column-density images."""

import re

from pydantic import Field, model_validator

from tracer.engine.runspec.order import is_below
from tracer.inputs.number import Cells
from tracer.inputs.quantity import SkyOffset
from tracer.inputs.sky import ViewerDirection
from tracer.inputs.table import Table, conflict
from tracer.inputs.text import Line


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

    @model_validator(mode="after")
    def _has_an_area(self) -> "ImageTable":
        for axis, (low, high) in (("horizontal", self.horizontal), ("vertical", self.vertical)):
            if not is_below(low, high):
                raise conflict(axis, f'["{low}", "{high}"] has no width; the first must be below the second')
        return self


def product_name(name: str) -> str:
    """Return an image's name in the product: lower case, all but a-z, 0-9 and `_` replaced by `_`."""
    return re.sub(r"[^a-z0-9_]", "_", name.lower())
