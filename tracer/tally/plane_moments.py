"""Moments of the velocity in the pixels of images, from raw counts."""

from collections.abc import Iterator, Sequence
from typing import NamedTuple

import numpy as np

from tracer.kernels.scoring import Tally
from tracer.tally.axes import ImagePlane
from tracer.tally.buffer import plane_shape, plane_size, velocity_middle, velocity_sums
from tracer.tally.velocity_moments import Moments, from_sums


class PlaneMoments(NamedTuple):
    """The moments of an image's pixels, shape (rows, columns); with a leading dimension of lines if `by_line`."""

    plane: ImagePlane
    by_line: bool
    moments: Moments


def plane_moments(tally: Tally, planes: Sequence[ImagePlane]) -> Iterator[PlaneMoments]:
    """Yield the moments of each image that is resolved by velocity: of its atoms, then, with lines, of their light."""
    pixel = first = 0
    for plane in planes:
        size, sums = plane_size(plane), velocity_sums(plane)
        pixels, counted = slice(pixel, pixel + size), slice(first + (sums - 2) * size, first + sums * size)
        pixel, first = pixels.stop, first + sums * size
        if sums == 0:
            continue
        sources = [(False, tally.image_content, tally.velocity_content)]
        if len(tally.image_emission):
            sources.append((True, tally.image_emission, tally.velocity_emission))
        for by_line, whole, powers in sources:
            leading = whole.shape[:-1]
            weight = whole[..., pixels].reshape(*leading, *plane_shape(plane))
            linear, square = np.moveaxis(
                powers[..., counted].reshape(*leading, 2, *plane_shape(plane)), len(leading), 0
            )
            yield PlaneMoments(plane, by_line, from_sums(weight, linear, square, velocity_middle(plane)))
