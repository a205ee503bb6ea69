"""The releases of a product as a profile sees them: images through slit and seeing, or lines of sight."""

import tomllib
from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray
from scipy.sparse import csr_array

from tracer.errors import InputError
from tracer.observe.fit.images import SkyImage, check_smearing, image_of
from tracer.observe.fit.rays import seen_through_grid
from tracer.observe.fit.sky import Aperture, Spread, Track, View
from tracer.observe.fit.smearing import smearing
from tracer.observe.fit.sources import Response, Source
from tracer.observe.gas import LEAST_REPLICATES, unknown_line
from tracer.observe.optical_depth import optical_depth
from tracer.observe.responses import speed_edges
from tracer.observe.run_facts import line_facts, run_facts
from tracer.product.layout import BOUNDS, LAUNCH_SPEED, LINE, ORDER, RELEASE, REPLICATE, REPLICATES

Floats = NDArray[np.float64]


class Optics(NamedTuple):
    """A profile in the sky: where it is seen from, its points, the slit and the seeing."""

    view: View
    track: Track
    aperture: Aperture | None
    spread: Spread | None
    image: str | None


class Gathered(NamedTuple):
    """The sources of a product, `how` they were seen, and what is to be said about it."""

    sources: tuple[Source, ...]
    how: str
    warnings: tuple[str, ...]


def variables_for(ds: xr.Dataset, line: str | None, image: str | None, responses: bool) -> list[str]:
    """Return the names of what is read of a product, so that nothing else need come into memory.

    `image` is None where no image shows the profile and lines of sight are taken.
    """
    kind = "column" if line is None else "brightness"
    wanted = {"release_flux", "cell_area", LAUNCH_SPEED + BOUNDS}
    if image is not None:
        wanted |= {f"{kind}_{image}", f"{kind}_{image}{REPLICATES}", f"column_{image}"}
        if responses:
            wanted |= {f"{kind}_response_{image}", f"{kind}_response_{image}{REPLICATES}"}
    else:
        fields = ["number_density", *(["emission_rate"] if line else [])]
        wanted |= {*fields, *(name + REPLICATES for name in fields), "surface_temperature"}
    bounds = {str(name) for name in ds.data_vars if str(name).endswith(BOUNDS)}
    return [str(name) for name in ds.data_vars if str(name) in wanted | bounds]


def gather(ds: xr.Dataset, product: str, line: str | None, optics: Optics, responses: bool) -> Gathered:
    """Return what each release of a product contributes to the points of a profile.

    Parameters
    ----------
    ds : xarray.Dataset
        A product with replicates.
    product : str
        Its name, for messages.
    line : str, optional
        The line of a brightness [rayleigh]; column density [m-2] where absent.
    optics : Optics
        How the profile was seen.
    responses : bool
        Whether the product's responses by launch speed are wanted.

    Raises
    ------
    InputError
        No such line, no replicates, an image that is too small or too coarse, or responses that are not there.
    """
    known = tuple(str(name) for name in ds["line_name"].values) if LINE in ds.dims else ()
    if line is not None and line not in known:
        raise unknown_line(line, known)
    if ds.sizes.get(REPLICATE, 0) < LEAST_REPLICATES:
        raise InputError(
            "has no replicates, from which the error of the model comes; run again with ensemble.replicates = 20"
        )
    image = image_of(ds, optics.view, optics.image, optics.track)
    if image is None:
        if responses:
            raise InputError(
                f"has no image {optics.view.words}; law parameters are fitted from the responses of an image: add an "
                "[[image]] with that look_from to the run file, with ensemble.speed_bins, and run it again"
            )
        mean, replicates, warnings = seen_through_grid(
            ds, line, optics.view, optics.track, optics.aperture, optics.spread
        )
        return Gathered(
            _sources(ds, product, mean, replicates, [None] * len(mean), np.full(mean.shape, np.nan)),
            "lines of sight through its grid",
            tuple(warnings),
        )
    weights = smearing(image.edges, optics.track, optics.aperture, optics.spread)
    warnings = check_smearing(image, optics.track, weights, optics.aperture, optics.spread)
    name = f"{'column' if line is None else 'brightness'}_{image.name}"
    mean = _through(weights, _of_line(ds[name], line, known).transpose(RELEASE, ...).values)
    replicates = _through(
        weights, _of_line(ds[name + REPLICATES], line, known).transpose(REPLICATE, RELEASE, ...).values
    )
    found = _responses(ds, image, line, known, weights) if responses else [None] * len(mean)
    depth = np.zeros(mean.shape)
    if line is not None:
        columns = _through(weights, ds[f"column_{image.name}"].transpose(RELEASE, ...).values)
        depth = _depths(ds, line, np.maximum(columns, 0.0))
    sources = _sources(ds, product, mean, replicates, found, depth)
    return Gathered(sources, f"image {image.name}", tuple(warnings))


def _of_line(array: xr.DataArray, line: str | None, known: Sequence[str]) -> xr.DataArray:
    return array if line is None else array.isel({LINE: list(known).index(line)})


def _through(weights: csr_array, images: NDArray[Any]) -> Floats:
    """Return the points (..., N) of images (..., rows, columns)."""
    flat = images.reshape(-1, weights.shape[1])
    points = np.empty((len(flat), weights.shape[0]))
    for number, one in enumerate(flat):
        points[number] = weights @ one.astype(np.float64)
    return points.reshape(*images.shape[:-2], -1)


def _sources(
    ds: xr.Dataset,
    product: str,
    mean: Floats,
    replicates: Floats,
    responses: Sequence[Response | None],
    depths: Floats,
) -> tuple[Source, ...]:
    """Return the sources, from points (R, N) and (G, R, N) at the product's rates."""
    area = np.asarray(ds["cell_area"].values)
    flux = np.asarray(ds["release_flux"].transpose(RELEASE, "latitude", "local_time").values)
    rates = (flux * area[:, np.newaxis]).sum(axis=(1, 2))
    counts = np.atleast_1d(np.asarray(ds.attrs.get("replicate_batches", ()), dtype=np.float64))
    batches = counts if counts.size == len(replicates) else np.ones(len(replicates))
    speeds = _speed_tables(ds)
    return tuple(
        Source(
            name=str(name),
            product=product,
            rate=float(rates[i]),
            mean=mean[i] / rates[i],
            replicates=replicates[:, i] / rates[i],
            batches=batches,
            speed=speeds.get(str(name), {}),
            response=responses[i],
            depth=depths[i] / rates[i],
        )
        for i, name in enumerate(ds["release_name"].values)
    )


def _depths(ds: xr.Dataset, line: str, columns: Floats) -> Floats:
    """Return the optical depths (R, N) of columns (R, N) [m-2] at the centre of a line, by the run's laws of speed."""
    facts = run_facts(str(ds.attrs.get("run_file", "")), float(ds.attrs["body_radius"]), None)
    names = [str(name) for name in ds["release_name"].values]
    speeds = np.array([facts.doppler_speeds.get(name, np.nan) for name in names])
    return optical_depth(columns.T, line_facts(line, facts.species), speeds).T


def _responses(
    ds: xr.Dataset, image: SkyImage, line: str | None, known: Sequence[str], weights: csr_array
) -> list[Response | None]:
    name = f"{'column' if line is None else 'brightness'}_response_{image.name}"
    if name not in ds or name + REPLICATES not in ds:
        raise InputError(
            f"has no {name}; law parameters are fitted from responses by launch speed: run again with "
            "ensemble.speed_bins = 32"
        )
    edges = speed_edges(ds)
    order = (RELEASE, LAUNCH_SPEED, ORDER)
    means = _through(weights, _of_line(ds[name], line, known).transpose(*order, ...).values)
    replicates = _through(
        weights, _of_line(ds[name + REPLICATES], line, known).transpose(REPLICATE, *order, ...).values
    )
    mass, escape = float(ds.attrs["atom_mass"]), float(ds.attrs["escape_speed"])
    return [Response(edges, mass, escape, means[i], replicates[:, i]) for i in range(len(means))]


def _run_file(ds: xr.Dataset) -> dict[str, Any]:
    try:
        return tomllib.loads(str(ds.attrs.get("run_file", "")))
    except (tomllib.TOMLDecodeError, RecursionError):
        return {}


def _speed_tables(ds: xr.Dataset) -> dict[str, dict[str, Any]]:
    releases = _run_file(ds).get("release", ())
    return {
        str(entry.get("name")): entry["speed"]
        for entry in releases
        if isinstance(entry, dict) and isinstance(entry.get("speed"), dict)
    }
