"""Parts of an image whose light is added up: the body's disc, and pieces of the tail."""

from itertools import pairwise
from math import hypot
from typing import NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.plots.body import ON_AXIS, sun_in_sky
from tracer.plots.planes import edges
from tracer.plots.sky import Sky
from tracer.product.layout import image_dimensions

HALF_WIDTH = 1.0
"""Half width of a piece of the tail, in body radii; at least half a pixel."""
TAIL_FROM, TAIL_PIECES = 1.5, 3
"""Where the first piece begins, in body radii from the centre, and how many there are."""


class Aperture(NamedTuple):
    """A part of an image: its words, and the pixels (rows, columns) whose middles lie in it."""

    words: str
    pixels: NDArray[np.bool_]


def apertures(product: xr.Dataset, sky: Sky, radius: float) -> list[Aperture]:
    """Return the disc and pieces of the tail behind it, evenly long on a logarithmic scale to the image's rim.

    Where the viewer stands on the tail's axis they are rings round the disc. An image that shows nothing of all that is
    one aperture.
    """
    vertical, horizontal = (edges(product, axis) / radius for axis in image_dimensions(sky.name))
    right, up = 0.5 * (horizontal[1:] + horizontal[:-1]), 0.5 * (vertical[1:] + vertical[:-1])[:, np.newaxis]
    from_centre = np.hypot(right, up)
    if hypot(sky.right[0], sky.up[0]) < ON_AXIS:
        along, inside, word = from_centre, np.ones_like(from_centre, dtype=bool), "ring"
    else:
        toward_sun = sun_in_sky(sky.up, sky.right)
        along = -(right * toward_sun[0] + up * toward_sun[1])
        pixel = np.array([horizontal[1] - horizontal[0], vertical[1] - vertical[0]])
        half_width = max(HALF_WIDTH, 0.5 * float(pixel @ np.abs(toward_sun[::-1])))
        inside = np.abs(right * toward_sun[1] - up * toward_sun[0]) <= half_width * (1.0 + 1e-9)
        word = "tail"
    made = [Aperture("disc of the body", from_centre < 1.0)]
    rim = float(along[inside].max(initial=0.0))
    if rim > TAIL_FROM:
        ends = np.geomspace(TAIL_FROM, rim * (1.0 + 1e-9), TAIL_PIECES + 1)
        for low, high in pairwise(ends):
            words = f"{word} {low:.2g} to {high:.2g} radii"
            made.append(Aperture(words, inside & (along >= low) & (along < high)))
    shown = [one for one in made if one.pixels.any()]
    return shown or [Aperture("whole image", np.ones_like(from_centre, dtype=bool))]
