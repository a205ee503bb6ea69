"""What the numbers of a product mean in time: of a body that moves on its orbit, and of one that stands still."""

from collections.abc import Iterator
from numbers import Real
from typing import NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.plots.run_text import run_tables
from tracer.product.layout import RELEASE
from tracer.product.run_file import entries

EVENTS = ("return_flux", "capture_flux", "escape_flux", "escape_rate_by_direction")
"""Variables that count events: with a body that moves, those of the window before the stated position."""
NOTABLE = 0.01
"""Share of the survival time behind the age limit that is worth a caution."""
_LENGTHS = ((86400.0, "d"), (3600.0, "h"), (60.0, "min"))


class Motion(NamedTuple):
    """How a moving body is counted.

    `window` [s] before the stated position in which events count as fluxes; `older` (R,), of the survival time of each
    release's atoms up to twice the age limit, the share behind the limit, which is left out.
    """

    window: float
    older: NDArray[np.float64]


def motion_of(product: xr.Dataset) -> Motion | None:
    """Return how a product counts a body that moves; None where the body stands still or nothing is told."""
    window = product.attrs.get("event_window")
    if product.attrs.get("motion") != "moving" or not isinstance(window, Real):
        return None
    return Motion(float(window), _older(product))


def _older(product: xr.Dataset) -> NDArray[np.float64]:
    # netCDF keeps an attribute of one element as a plain number.
    told = np.atleast_1d(np.asarray(product.attrs.get("share_older_than_age_limit", np.nan)))
    releases = product.sizes[RELEASE]
    if told.shape != (releases,) or told.dtype.kind not in "fiu":
        return np.full(releases, np.nan)
    return told.astype(np.float64)


def window_words(motion: Motion) -> str:
    """Return the window of the fluxes as people read it, with three digits."""
    size, unit = next(((size, unit) for size, unit in _LENGTHS if motion.window >= size), (1.0, "s"))
    return f"{motion.window / size:.3g} {unit}"


def event_note(product: xr.Dataset, variable: str) -> str:
    """Return what a figure of `variable` must say about time; empty where there is nothing to say."""
    motion = motion_of(product)
    if motion is None or variable not in EVENTS:
        return ""
    return f"Events of the last {window_words(motion)} before the stated position."


def time_words(product: xr.Dataset) -> Iterator[tuple[str, str]]:
    """Yield names of numbers, and of which moment and which atoms they are."""
    motion = motion_of(product)
    if motion is None:
        yield (
            "All numbers",
            "The steady state: every source has released at its rate for longer than the age limit, and neither "
            "sunlight nor the body's distance from the Sun changed meanwhile.",
        )
        return
    yield (
        "Density, columns, images, light, ions",
        "Those at the stated position, made by atoms of all ages, released while the body was on its way there.",
    )
    yield (
        "Return, capture and escape fluxes",
        f"What happens in the last {window_words(motion)} before the stated position. The release flux is that at the "
        "stated position.",
    )
    yield (
        "Particle budget, mean life, flights",
        "Those of the atoms released at the stated position, followed on along the orbit to their end. They need not "
        "balance the fluxes, whose atoms left earlier.",
    )
    yield "Release rates", _rate_words(product)
    if np.isfinite(motion.older).any():
        yield "Left out by the age limit", _older_words(product, motion)


def older_worth_a_caution(product: xr.Dataset) -> float | None:
    """Return the largest share of survival time behind the age limit [of 1], None where it is not worth a word."""
    motion = motion_of(product)
    if motion is None or not np.isfinite(motion.older).any():
        return None
    largest = float(np.nanmax(motion.older))
    return largest if largest > NOTABLE else None


def _rate_words(product: xr.Dataset) -> str:
    words = []
    for entry in entries(run_tables(product), "release"):
        follows = entry.get("rate_scaling", "constant") == "inverse-square"
        way = (
            "with the inverse square of the distance from the Sun"
            if follows
            else "the same all along the orbit"
        )
        words.append(f"{entry.get('name')}, {way}")
    return f"{'; '.join(words)}. Rates told here are those at the stated position."


def _older_words(product: xr.Dataset, motion: Motion) -> str:
    names = [str(name) for name in product["release_name"].values]
    each = ", ".join(
        f"{100.0 * share:.2g} %" + (f" ({name})" if len(names) > 1 else "")
        for name, share in zip(names, motion.older, strict=True)
    )
    return f"Of the survival time up to twice the age limit, what lies behind the limit is missing: {each}."
