"""Which image of a product shows a view, and whether it is wide and fine enough for a profile."""

from typing import NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from scipy.sparse import csr_array

from tracer.errors import InputError
from tracer.observe.fit.sky import Aperture, Spread, Track, View
from tracer.observe.sights import angle_between
from tracer.product.layout import BOUNDS, HORIZONTAL, IMAGE, image_dimensions
from tracer.units import quoted

Floats = NDArray[np.float64]

SAME_VIEW = 0.1
"""Angle [deg] within which an image's viewer stands where the observer does."""
COLUMN = "column_"
KILOMETRE = 1e3
ROUNDING = 1e-12
"""Part of an image's size below which a place in a message is 0."""

MISSING_REFUSED, MISSING_NAMED = 0.2, 0.01
"""Share of a point's smeared light that may fall outside of the image before it is refused, or named."""
COARSE_REFUSED, COARSE_NAMED = 4.0, 0.5
"""Size of a pixel, over the width of slit or seeing, above which an image is refused, or named, as too coarse."""


class SkyImage(NamedTuple):
    """An image of a product: its name, and the edges of its pixels upwards and rightwards [m]."""

    name: str
    edges: tuple[Floats, Floats]

    @property
    def pixel(self) -> float:
        """Longer side of a pixel [m]."""
        return max(float(np.diff(axis).max()) for axis in self.edges)


def image_names(ds: xr.Dataset) -> list[str]:
    """Return the names of a product's images."""
    end = HORIZONTAL.removeprefix(IMAGE)
    names = [str(axis).removesuffix(end) for axis in ds.dims if str(axis).endswith(end)]
    return [name for name in names if COLUMN + name in ds]


def image_of(ds: xr.Dataset, view: View, wanted: str | None, track: Track) -> SkyImage | None:
    """Return the product's image from `view` that holds the track, the finest of several; None without any.

    Raises
    ------
    InputError
        The image `wanted` is missing or seen from elsewhere, or no image from there holds all points of the track.
    """
    same = [name for name in image_names(ds) if _looks_from(ds, name, view)]
    if wanted is not None:
        named = [name for name in same if wanted in (name, _title(ds, name))]
        if not named:
            allowed = ", ".join(map(quoted, same)) or "none"
            raise InputError(f"has no image {quoted(wanted)} {view.words}; from there it has {allowed}")
        same = named
    images = [SkyImage(name, (_edges(ds, name, 0), _edges(ds, name, 1))) for name in same]
    holding = [image for image in images if _holds(image, track)]
    if images and not holding:
        raise InputError(too_small(images[0], track))
    return min(holding, key=lambda image: image.pixel) if holding else None


def check_smearing(
    image: SkyImage, track: Track, weights: csr_array, aperture: Aperture | None, spread: Spread | None
) -> list[str]:
    """Return what is to be said of an image's extent and pixels for a slit and seeing.

    Raises
    ------
    InputError
        Too much of the smeared light would come from outside of the image, or its pixels are far too large.
    """
    words = []
    missing = 1.0 - np.asarray(weights.sum(axis=1)).ravel()
    row, most = int(np.argmax(missing)), float(missing.max())
    text = f"image {image.name}: {100.0 * most:.3g} % of what row {row + 1} gathers lies outside of it"
    if most > MISSING_REFUSED:
        raise InputError(f"{text}; run with a larger image")
    if most > MISSING_NAMED:
        words.append(f"{text} and counts as dark")
    if np.ptp(track.h) < image.pixel and np.ptp(track.v) < image.pixel:
        words.append(
            f"image {image.name}: all points of the profile lie within one pixel; is the positions' unit right?"
        )
    blur = max(spread.fwhm if spread else 0.0, min(aperture.length, aperture.width) if aperture else 0.0)
    if blur > 0.0 and image.pixel > COARSE_NAMED * blur:
        text = (
            f"image {image.name}: its pixels of {image.pixel / KILOMETRE:.4g} km are coarse for a slit and seeing of "
            f"{blur / KILOMETRE:.4g} km"
        )
        if image.pixel > COARSE_REFUSED * blur:
            raise InputError(f"{text}; run with more pixels")
        words.append(f"{text}: half of that or less would smear nothing more")
    return words


def _looks_from(ds: xr.Dataset, name: str, view: View) -> bool:
    toward = np.array(ds[COLUMN + name].attrs["toward_viewer"], dtype=np.float64)
    return bool(angle_between(toward[np.newaxis], view.toward_viewer[np.newaxis])[0] < SAME_VIEW)


def _title(ds: xr.Dataset, name: str) -> str:
    return str(ds[COLUMN + name].attrs.get("long_name", name)).partition(", ")[2]


def _edges(ds: xr.Dataset, name: str, axis: int) -> Floats:
    bounds = np.asarray(ds[image_dimensions(name)[axis] + BOUNDS].values, dtype=np.float64)
    return np.append(bounds[:, 0], bounds[-1, 1])


def _holds(image: SkyImage, track: Track) -> bool:
    return all(
        bool(np.all((places >= axis[0]) & (places <= axis[-1])))
        for axis, places in zip(image.edges, (track.v, track.h), strict=True)
    )


def too_small(image: SkyImage, track: Track) -> str:
    """Return what is said of an image that does not hold all points of a track."""
    parts = []
    for words, axis, places in zip(("upwards", "rightwards"), image.edges, (track.v, track.h), strict=True):
        ends = (axis[0], axis[-1], places.min(), places.max())
        # A place on the axis is off it by the rounding of sine and cosine.
        low, high, nearest, farthest = (
            f"{_rounded(end, axis[-1] - axis[0]) / KILOMETRE:.6g}" for end in ends
        )
        parts.append(f"{words} from {low} to {high} km, the profile from {nearest} to {farthest} km")
    return f"image {image.name} does not hold the profile: it reaches {'; '.join(parts)}. Is the positions' unit right?"


def _rounded(place: float, size: float) -> float:
    return 0.0 if abs(place) < ROUNDING * size else place
