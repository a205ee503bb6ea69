"""What is drawn of a product's image: its column density, or its brightness in a line."""

from typing import NamedTuple

import xarray as xr

from tracer.plots.reading_units import KILORAYLEIGH, PER_SQUARE_CENTIMETRE
from tracer.plots.sky import BRIGHTNESS, COLUMN, Sky, shining
from tracer.plots.style import BRIGHTNESS_COLOURS, COLUMN_COLOURS


class Seen(NamedTuple):
    """What is seen of a product's image: a variable of it, its factor to `label`'s unit, in words and colours."""

    variable: str
    factor: float
    what: str
    label: str
    colours: str


def seen_in(sky: Sky, line: str | None) -> Seen:
    """Return what is seen of an image: brightness in a line [kR], or column density [cm-2] without one."""
    if line is None:
        label = "Column density (cm$^{-2}$)"
        return Seen(COLUMN + sky.name, PER_SQUARE_CENTIMETRE, "column density", label, COLUMN_COLOURS)
    what = f"brightness in {line}"
    return Seen(BRIGHTNESS + sky.name, KILORAYLEIGH, what, "Brightness (kR)", BRIGHTNESS_COLOURS)


def of_line(product: xr.Dataset, line: str | None) -> xr.Dataset:
    """Return the product, of whose lines only `line` where one is asked for.

    Raises
    ------
    InputError
        There is no such line.
    """
    return product if line is None else shining(product, line)
