"""A profile through a product's grid, where no image shows it: lines of sight, smeared as an image would be."""

import math

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.constants import RAYLEIGH
from tracer.errors import InputError
from tracer.observe.fit.sky import FWHM_OF_GAUSSIAN, Aperture, Spread, Track, View
from tracer.observe.fit.smearing import smearing
from tracer.observe.gas import Gas, gas_of
from tracer.observe.integration import blocks, integrals_along
from tracer.observe.sights import Sights

Floats = NDArray[np.float64]

FAR = 2.0
"""How far off parallel lines of sight begin, over the radius of the traced space."""
PIXELS_IN_BLUR = 5.0
"""Pixels across slit or seeing."""
MOST_PIXELS = 40_000
REACH = {False: 2.0, True: 8.0}
"""How far beyond the points lines of sight are taken, in full widths at half maximum: a Moffat function has wings."""
KILOMETRE = 1e3


def seen_through_grid(
    ds: xr.Dataset,
    line: str | None,
    view: View,
    track: Track,
    aperture: Aperture | None,
    spread: Spread | None,
) -> tuple[Floats, Floats, list[str]]:
    """Return points (R, N) and replicates (G, R, N) of a profile at the product's rates, and what is to be said.

    Raises
    ------
    InputError
        A product without replicates, or a profile that leaves the grid.
    """
    gas = gas_of(ds, () if line is None else (line,))
    farthest = float(np.max(np.hypot(track.h, track.v)))
    if farthest > gas.top_radius:
        raise InputError(
            f"has no image {view.words}, and its grid ends {gas.top_radius / KILOMETRE:.6g} km from the centre, before "
            f"the profile does at {farthest / KILOMETRE:.6g} km; add an [[image]] with that look_from to the run file"
        )
    words = [
        f"no image {view.words}: lines of sight through the grid, which ends {gas.top_radius / KILOMETRE:.6g} km from "
        "the centre; gas beyond it is not seen"
    ]
    if aperture is None and spread is None:
        mean, replicates = _integrals(gas, line, view, track.h, track.v)
        return mean, replicates, words
    edges = _pixels(track, aperture, spread)
    if edges[0].size * edges[1].size >= MOST_PIXELS:
        words.append(
            "the profile is long for its slit and seeing: lines of sight lie farther apart than a fifth of these"
        )
    v, h = np.meshgrid(*(0.5 * (axis[1:] + axis[:-1]) for axis in edges), indexing="ij")
    mean, replicates = _integrals(gas, line, view, h.ravel(), v.ravel())
    weights = smearing(edges, track, aperture, spread)
    return (
        np.asarray((weights @ mean.T).T),
        np.stack([np.asarray((weights @ one.T).T) for one in replicates]),
        words,
    )


def _pixels(track: Track, aperture: Aperture | None, spread: Spread | None) -> tuple[Floats, Floats]:
    """Return edges upwards and rightwards of pixels that hold all that slit and seeing gather."""
    blur = min(
        spread.fwhm if spread else math.inf, min(aperture.length, aperture.width) if aperture else math.inf
    )
    reach = 0.0
    if spread is not None:
        reach += REACH[spread.beta is not None] * spread.fwhm + blur / FWHM_OF_GAUSSIAN
    if aperture is not None:
        reach += 0.5 * math.hypot(aperture.length, aperture.width)
    spans = [(float(axis.min()) - reach, float(axis.max()) + reach) for axis in (track.v, track.h)]
    size = blur / PIXELS_IN_BLUR
    area = math.prod(high - low for low, high in spans)
    size = max(size, math.sqrt(area / MOST_PIXELS))
    counts = [max(1, math.ceil((high - low) / size)) for low, high in spans]
    up, right = (np.linspace(low, high, n + 1) for (low, high), n in zip(spans, counts, strict=True))
    return up, right


def _integrals(gas: Gas, line: str | None, view: View, h: Floats, v: Floats) -> tuple[Floats, Floats]:
    """Return columns [m-2], or brightness [rayleigh], (R, M) and (G, R, M) along parallel lines of sight."""
    start = FAR * gas.traced_radius * view.toward_viewer
    places = h[:, None] * view.right + v[:, None] * view.up
    sights = Sights(start + places, np.broadcast_to(-view.toward_viewer, places.shape))
    means, replicates = [], []
    for _, some in blocks(sights):
        found = integrals_along(gas, some)
        if line is None:
            means.append(found.column)
            replicates.append(found.column_replicates)
        else:
            means.append(found.photons[:, 0] / RAYLEIGH)
            replicates.append(found.photon_replicates[:, 0] / RAYLEIGH)
    return np.concatenate(means).T, np.concatenate(replicates).transpose(2, 1, 0)
