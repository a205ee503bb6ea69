"""Images of a product: which there are, and how their viewers see."""

from collections.abc import Iterable
from typing import NamedTuple

import xarray as xr

from tracer.errors import InputError
from tracer.plots.body import Vector
from tracer.plots.field import listed
from tracer.product.layout import HORIZONTAL, IMAGE, LINE

COLUMN, BRIGHTNESS = "column_", "brightness_"


class Sky(NamedTuple):
    """An image's sky plane: product name, the user's name, directions in the Sun-fixed frame."""

    name: str
    title: str
    toward_viewer: Vector
    up: Vector
    right: Vector


def image_names(product: xr.Dataset) -> list[str]:
    """Return the names of the product's images."""
    end = HORIZONTAL.removeprefix(IMAGE)
    return [
        str(axis).removesuffix(end)
        for axis in product.dims
        if str(axis).endswith(end) and COLUMN + str(axis).removesuffix(end) in product
    ]


def sky_of(product: xr.Dataset, wanted: str | None) -> Sky:
    """Return the image asked for, by its name in the product or in the run file; the only one where none is named.

    Raises
    ------
    InputError
        Where there is no such image, none at all, or several and none is named.
    """
    skies = [_read_sky(product, name) for name in image_names(product)]
    if not skies:
        raise InputError("the product has no image; add an [[image]] to its run file and run it again")
    allowed = listed([sky.name for sky in skies])
    if wanted is None:
        if len(skies) > 1:
            raise InputError(f"the product has {len(skies)} images, name one of them: {allowed}")
        return skies[0]
    named = [sky for sky in skies if sky.name == wanted] or [sky for sky in skies if sky.title == wanted]
    if not named:
        raise InputError(f'there is no image "{wanted}"; allowed: {allowed}')
    return named[0]


def _read_sky(product: xr.Dataset, name: str) -> Sky:
    attributes = product[COLUMN + name].attrs
    title = str(attributes.get("long_name", name)).partition(", ")[2] or name
    return Sky(name, title, *(_vector(attributes[key]) for key in ("toward_viewer", "up", "right")))


def _vector(parts: Iterable[float]) -> Vector:
    x, y, z = map(float, parts)
    return x, y, z


def line_names(product: xr.Dataset) -> list[str]:
    """Return the names of the product's emission lines."""
    return [str(name) for name in product["line_name"].values] if "line_name" in product else []


def shining(product: xr.Dataset, line: str) -> xr.Dataset:
    """Return the product with what shines in `line` alone.

    Raises
    ------
    InputError
        Where there is no such line.
    """
    known = line_names(product)
    if not known:
        raise InputError(f'there is no line "{line}": the gas of this product has no lines with g')
    if line not in known:
        raise InputError(f'there is no line "{line}"; allowed: {listed(known)}')
    return product.sel({LINE: line})
