"""The host planet beside a moon: where it stands in an image, and where a plane cuts it."""

import math
from typing import NamedTuple

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.patheffects import withStroke
from numpy.typing import NDArray

from tracer.plots.body import Disc, Vector, draw_disc
from tracer.plots.style import SMALL_SIZE
from tracer.plots.words import plain

HOST = "name of the host planet"
"""Name of the artist."""
OUTLINED_WORDS = "{name} is outlined: gas before and behind it is counted."
CUT_WORDS = "{name} is drawn where a plane cuts it."
GAP = 3.0
"""Distance [pt] of the name from the limb."""
NEAR_RIM = 0.15
"""Share of the width, from either side, where the name stands on the inner side of the planet's middle."""

Limits = tuple[float, float]


class HostDisc(NamedTuple):
    """The host planet in a picture: its name, and its circle in body radii."""

    name: str
    disc: Disc

    def words(self, template: str) -> str:
        """Return `template`, such as `OUTLINED_WORDS`, with the name at the head of a sentence."""
        return template.format(name=self.name[:1].upper() + self.name[1:])


def host_in_sky(
    product: xr.Dataset, radius: float, up: Vector, right: Vector, across: Limits, along: Limits
) -> HostDisc | None:
    """Return the host as an image shows it; None without a host, or where it stands outside the image.

    Parameters
    ----------
    product : xarray.Dataset
        As `open_product` gives it.
    radius : float
        Of the body [m].
    up, right : (float, float, float)
        Unit vectors of the image in the Sun-fixed frame.
    across, along : (float, float)
        Limits of the image rightwards and upwards, in body radii.
    """
    sphere = _sphere(product, radius)
    if sphere is None:
        return None
    place, size = sphere
    disc = Disc(float(np.dot(right, place)), float(np.dot(up, place)), size)
    return HostDisc(_name(product), disc) if disc.meets(across, along) else None


def host_in_plane(
    product: xr.Dataset, radius: float, toward_viewer: Vector, up: Vector, right: Vector, top: float
) -> HostDisc | None:
    """Return where the plane through the body's centre cuts the host; None where it does not, or beyond the grid.

    Arguments as those of `host_in_sky`; `toward_viewer` is normal to the plane, and `top` the grid's radius in body
    radii.
    """
    sphere = _sphere(product, radius)
    if sphere is None:
        return None
    place, size = sphere
    height = abs(float(np.dot(toward_viewer, place)))
    if height >= size:
        return None
    disc = Disc(float(np.dot(right, place)), float(np.dot(up, place)), math.sqrt(size**2 - height**2))
    return HostDisc(_name(product), disc) if math.hypot(disc.right, disc.up) < top + disc.radius else None


def _sphere(product: xr.Dataset, radius: float) -> tuple[NDArray[np.float64], float] | None:
    """Return the host's place in the Sun-fixed frame and its radius in body radii; None where there is no host."""
    place = np.ravel(np.asarray(product.attrs.get("host_position", ()), dtype=np.float64)) / radius
    size = float(product.attrs.get("host_radius", math.nan)) / radius
    return (place, size) if place.shape == (3,) and np.isfinite(place).all() and size > 0.0 else None


def _name(product: xr.Dataset) -> str:
    return str(product.attrs.get("host", "the host"))


def outline_host(axes: Axes, host: HostDisc | None, toward_viewer: Vector, up: Vector, right: Vector) -> None:
    """Draw a host, if there is one, over an image that shows through, with its name."""
    if host is not None:
        draw_disc(axes, toward_viewer, up, right, host.disc)
        name_host(axes, host)


def name_host(axes: Axes, host: HostDisc) -> None:
    """Write the host's name above its limb, or below where there is no room; no letter leaves the axes."""
    (left, end), (low, high) = axes.get_xlim(), axes.get_ylim()
    _, up, radius = host.disc
    above = up + radius < low + (1.0 - NEAR_RIM) * (high - low)
    limb = up + radius if above else up - radius
    share = min(max((host.disc.right - left) / (end - left), 0.02), 0.98)
    axes.annotate(
        plain(host.name),
        xy=(left + share * (end - left), min(max(limb, low), high)),
        xytext=(0.0, GAP if above else -GAP),
        textcoords="offset points",
        ha="left" if share < NEAR_RIM else "right" if share > 1.0 - NEAR_RIM else "center",
        va="bottom" if above else "top",
        fontsize=SMALL_SIZE,
        path_effects=[withStroke(linewidth=1.8, foreground="white")],
        gid=HOST,
        zorder=4.0,
    )
