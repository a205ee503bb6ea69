"""What a netCDF file claims to hold, judged before any of it is read."""

import re
from typing import Any, NamedTuple

import numpy as np

from tracer.product.layout import (
    ALTITUDE,
    BOUNDS,
    EDGE,
    LABELS,
    LATITUDE,
    LAUNCH_SPEED,
    LOCAL_TIME,
    REPLICATE,
    REPLICATES,
    STANDARD_ERROR,
    VERTICAL,
    image_dimensions,
    layout,
    resolved_images,
    velocity_dimension,
)

NAME = re.compile(r"[a-z0-9_]{1,200}")
MOST_ALONG = 65_536
"""Positions that any dimension may have."""
MOST_EXPANSION = 2_000
"""Bytes that one byte of a file may stand for; deflate packs at most 1,032 into one."""
MOST_TEXT = 10_000_000
WHOLE_NUMBERS = ("batches", "particles_per_batch", "flights", "integration_steps", "workers")
REAL_NUMBERS = ("kernel_seconds", "wall_seconds", "body_radius")
TEXTS = ("title", "history", "source", "run_file", "scene_hash", "run_hash", "batch_ranges", "data_checksum")


LABEL_VARIABLES = frozenset(label.variable for label in LABELS)


class Swept(NamedTuple):
    """What a sweep's product has beside a run's: leading `dimensions`, variables of `text`, those that are `fixed`.

    Of the layout's variables those that are not fixed have the leading dimensions.
    """

    dimensions: tuple[str, ...] = ()
    text: frozenset[str] = frozenset()
    fixed: frozenset[str] = frozenset()


RUN = Swept()


def why_suspicious(file: Any, size: int, swept: Swept = RUN) -> str | None:
    """Return why a file of `size` bytes, opened as netCDF4.Dataset, cannot be a product's; None if it can.

    Only names, shapes, types and attributes are looked at: a file may claim any size without having it.
    """
    if file.groups or file.cmptypes or file.vltypes or file.enumtypes:
        return "holds groups or types that no product has"
    for name, dimension in file.dimensions.items():
        if not NAME.fullmatch(name):
            return f"has a dimension named {name[:80]!r}"
        if not 0 < len(dimension) <= MOST_ALONG:
            return f"has {len(dimension)} positions along {name}; at most {MOST_ALONG} are allowed"
    claimed = 0
    for name, variable in file.variables.items():
        if reason := _why_odd(name, variable, LABEL_VARIABLES | swept.text):
            return reason
        claimed += _bytes(variable)
    if claimed > MOST_EXPANSION * size:
        return f"claims {claimed:.3g} bytes of data in a file of {size}"
    return _why_misshapen(file, swept) or _why_false_words(file)


def _why_odd(name: str, variable: Any, texts: frozenset[str]) -> str | None:
    if not NAME.fullmatch(name):
        return f"has a variable named {name[:80]!r}"
    if (variable.dtype is str) != (name in texts):
        return f"has {'text' if variable.dtype is str else 'no text'} in {name}"
    if variable.dtype is not str and variable.dtype.kind not in "fiu":
        return f"has no numbers in {name}"
    return None


def _bytes(variable: Any) -> int:
    size = 1
    for length in variable.shape:
        size *= length
    return size if variable.dtype is str else size * int(variable.dtype.itemsize)


def _why_misshapen(file: Any, swept: Swept) -> str | None:
    """Return which known variable has other dimensions or another type than the layout says."""
    ending = VERTICAL.removeprefix("<image>")
    images = [name.removesuffix(ending) for name in file.dimensions if name.endswith(ending)]
    expected: dict[str, tuple[str, ...]] = {label.variable: (label.dimension,) for label in LABELS}
    resolved = resolved_images(file.dimensions)
    axes = [ALTITUDE, LATITUDE, LOCAL_TIME, LAUNCH_SPEED]
    axes += [axis for name in images for axis in image_dimensions(name)]
    axes += map(velocity_dimension, resolved)
    for axis in axes:
        expected |= {axis: (axis,), axis + BOUNDS: (axis, EDGE)}
    for name, row in layout(images, True, resolved, speeds=True).items():
        leading = () if name in swept.fixed else swept.dimensions
        dimensions = (*leading, *row.dimensions)
        expected |= {name: dimensions, name + STANDARD_ERROR: dimensions}
        expected[name + REPLICATES] = (*leading, REPLICATE, *row.dimensions)
    for name, dimensions in expected.items():
        variable = file.variables.get(name)
        if variable is None:
            continue
        if variable.dimensions != dimensions:
            return (
                f"has {name} over {', '.join(variable.dimensions)}; it must be over {', '.join(dimensions)}"
            )
        if name not in LABEL_VARIABLES and variable.dtype.kind != "f":
            return f"has whole numbers in {name}"
    return None


def _why_false_words(file: Any) -> str | None:
    for name in file.ncattrs():
        value = file.getncattr(name)
        if isinstance(value, str) and len(value) > MOST_TEXT:
            return f"has {len(value)} characters in its attribute {name}"
        if name in WHOLE_NUMBERS and not (np.ndim(value) == 0 and np.asarray(value).dtype.kind in "iu"):
            return f"has no whole number in its attribute {name}"
        if name in REAL_NUMBERS and not (np.ndim(value) == 0 and np.asarray(value).dtype.kind in "fiu"):
            return f"has no number in its attribute {name}"
        if name in TEXTS and not isinstance(value, str):
            return f"has no text in its attribute {name}"
    return None
