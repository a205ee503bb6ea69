"""Lengths on axes: body radii on one side, kilometres on the other."""

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.ticker import MaxNLocator
from numpy.typing import ArrayLike, NDArray

from tracer.errors import InputError

Scaling = Callable[[ArrayLike], NDArray[Any]]

KILOMETRE = 1e3
MOST_STEPS, STEPS = 7, (1, 2, 5, 10)
"""Number of steps between ticks, and the steps that read well."""
FEWEST_TICKS = 3
"""Ticks of the kilometres that there must be, though the steps become smaller."""


def body_radius(product: xr.Dataset) -> float:
    """Return the radius of the product's body [m].

    Raises
    ------
    InputError
        Where the product does not tell.
    """
    radius = float(product.attrs.get("body_radius", math.nan))
    if not radius > 0.0:
        raise InputError("the product does not tell its body_radius, which a figure needs")
    return radius


def kilometre_unit(extent: float) -> tuple[float, str]:
    """Return a unit of length [m] and its name, km times a power of 1000 that suits `extent` [m]."""
    power = 3 * math.floor(math.log10(extent / KILOMETRE) / 3.0) if extent > 0.0 else 0
    # One to three digits before the point read well with and without a power.
    power = 0 if -3 <= power <= 0 or 0.0 < extent / KILOMETRE < 1e4 else power
    return KILOMETRE * 10.0**power, "km" if power == 0 else rf"$10^{{{power}}}$ km"


def kilometres_across(axes: Axes, radius: float) -> None:
    """Add kilometres along the top of axes whose horizontal is in body radii of `radius` [m]."""
    unit, name = kilometre_unit(radius * max(map(abs, axes.get_xlim())))
    top = axes.secondary_xaxis("top", functions=scaling(radius / unit))
    top.xaxis.set_major_locator(MaxNLocator(MOST_STEPS, steps=STEPS, min_n_ticks=FEWEST_TICKS))
    top.set_xlabel(name, loc="right")


def kilometres_up(axes: Axes, radius: float) -> None:
    """Add kilometres along the right side of axes whose vertical is in body radii of `radius` [m]."""
    unit, name = kilometre_unit(radius * max(map(abs, axes.get_ylim())))
    side = axes.secondary_yaxis("right", functions=scaling(radius / unit))
    side.yaxis.set_major_locator(MaxNLocator(MOST_STEPS, steps=STEPS, min_n_ticks=FEWEST_TICKS))
    side.set_ylabel(name, loc="top")


def scaling(factor: float) -> tuple[Scaling, Scaling]:
    """Return the way from one axis to another, whose numbers are `factor` times as large, and the way back."""
    return lambda x: np.asarray(x) * factor, lambda x: np.asarray(x) / factor
