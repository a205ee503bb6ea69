"""One or several numbers of each point of a sweep, from the point's own product."""

from collections.abc import Callable

import numpy as np
import xarray as xr

from tracer.plots.field import Field
from tracer.plots.swept.axes import Points
from tracer.product.sweeping import sweep_point

OfPoint = Callable[[xr.Dataset], Field]


def of_each_point(sweep: xr.Dataset, points: Points, of_point: OfPoint) -> Field:
    """Return what `of_point` makes of each point's product, shape (F, N, ...); one point at a time is in memory."""
    flat = [of_point(sweep_point(sweep, int(number))) for number in points.numbers.ravel()]
    shape = (*points.numbers.shape, *flat[0].value.shape)
    return Field(*(np.array([one[part] for one in flat]).reshape(shape) for part in range(2)))
