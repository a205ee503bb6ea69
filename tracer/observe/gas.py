"""A product as a line of sight sees it: cells, what is in them, light and shadow."""

import math
from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.kernels.rays import Contents, SphericalCells
from tracer.kernels.shadow import Shadow
from tracer.observe.reconstruction import reconstruct
from tracer.observe.run_facts import LineFacts, RunFacts, line_facts, run_facts
from tracer.physics.sunlight import shadow_of
from tracer.product.layout import ALTITUDE, BOUNDS, LATITUDE, LINE, LOCAL_TIME, RELEASE, REPLICATE, REPLICATES
from tracer.units import quoted

Floats = NDArray[np.float64]

DENSITY, EMISSION = "number_density", "emission_rate"
CELLS = (ALTITUDE, LATITUDE, LOCAL_TIME)
LEAST_REPLICATES = 2


class Gas(NamedTuple):
    """The gas of a product.

    `radius` [m] of the body; `sun_distance` [m], None where the product knows none, with `sun_radial_velocity` [m s-1]
    and `true_anomaly` [deg] of the body; `contents` holds the number
    densities of the `releases`, then the emission rates of the first line by release, of the second, ...;
    `replicate_batches` (G,) says how many batches count into each replicate. `traced_radius` [m]: atoms were followed
    up to there.
    """

    title: str
    scene: str
    radius: float
    sun_distance: float | None
    sun_radial_velocity: float
    true_anomaly: float | None
    traced_radius: float
    releases: tuple[str, ...]
    lines: tuple[str, ...]
    line_facts: tuple[LineFacts, ...]
    cells: SphericalCells
    contents: Contents
    replicate_batches: Floats
    shadow: Shadow
    facts: RunFacts

    @property
    def top_radius(self) -> float:
        """Distance [m] of the grid's top from the centre."""
        return float(self.cells.radii[-1])

    @property
    def has_errors(self) -> bool:
        """Whether there are replicates enough for standard errors."""
        return bool(self.contents.replicates.shape[2] >= LEAST_REPLICATES)


def gas_of(ds: xr.Dataset, lines: Sequence[str] | None = None, errors: bool = True) -> Gas:
    """Return the gas of a product.

    Parameters
    ----------
    ds : xarray.Dataset
        A product, as `tracer.open_product` or `tracer.run` gives it.
    lines : sequence of str, optional
        Lines to look in; all of the product's where absent.
    errors : bool
        Whether standard errors are wanted, which come from replicates.

    Raises
    ------
    InputError
        An unknown line, a Dataset that lacks what is needed, or errors wanted without replicates.
    """
    for name in (DENSITY, *(axis + BOUNDS for axis in CELLS)):
        if name not in ds:
            raise InputError(f"the Dataset has no {name}; it must be a product of tracer run")
    if "body_radius" not in ds.attrs:
        raise InputError("the Dataset has no attribute body_radius; it must be a product of tracer run")
    radius = float(ds.attrs["body_radius"])
    known = tuple(str(name) for name in ds["line_name"].values) if LINE in ds.dims else ()
    chosen = _chosen_lines(lines, known)
    facts = run_facts(str(ds.attrs.get("run_file", "")), radius, _ground_temperature(ds))
    radii = radius + _edges(ds, ALTITUDE)
    distance = float(ds.attrs["sun_distance"]) if "sun_distance" in ds.attrs else None
    contents = _contents(ds, radii, [known.index(name) for name in chosen], errors)
    return Gas(
        title=str(ds.attrs.get("title", "")),
        scene=str(ds.attrs.get("scene_hash", "")),
        radius=radius,
        sun_distance=distance,
        sun_radial_velocity=float(ds.attrs.get("sun_radial_velocity", 0.0)),
        true_anomaly=float(ds.attrs["true_anomaly"]) if "true_anomaly" in ds.attrs else None,
        traced_radius=max(float(radii[-1]), facts.outer_radius or 0.0),
        releases=tuple(str(name) for name in ds["release_name"].values),
        lines=chosen,
        line_facts=tuple(line_facts(name, facts.species) for name in chosen),
        cells=_cells(ds, radii),
        contents=contents,
        replicate_batches=_replicate_batches(ds, contents.replicates.shape[2]),
        # Without a distance the light comes along -x from a Sun that is infinitely far.
        shadow=shadow_of("cylinder", radius, 1.0)
        if distance is None
        else shadow_of(facts.shadow or "penumbra", radius, distance),
        facts=facts,
    )


def without_the_rest(ds: xr.Dataset, errors: bool = True) -> xr.Dataset:
    """Return a product with only what `gas_of` reads of it, so that nothing else need come into memory."""
    needed = {DENSITY, EMISSION, "surface_temperature", "cell_area", *(axis + BOUNDS for axis in CELLS)}
    needed |= {name + REPLICATES for name in (DENSITY, EMISSION)} if errors else set()
    return ds.drop_vars([name for name in ds.data_vars if str(name) not in needed])


def _chosen_lines(wanted: Sequence[str] | None, known: tuple[str, ...]) -> tuple[str, ...]:
    if wanted is None:
        return known
    for name in wanted:
        if name not in known:
            raise unknown_line(name, known)
    return tuple(name for name in known if name in wanted)


def unknown_line(name: str, known: Sequence[str]) -> InputError:
    """Return the error of a line that the product does not have."""
    if not known:
        return InputError(
            f"there is no line {quoted(name)}: the gas of this product has no lines with known g"
        )
    return InputError(f"there is no line {quoted(name)}; allowed: {', '.join(map(quoted, known))}")


def _edges(ds: xr.Dataset, axis: str) -> Floats:
    bounds = np.asarray(ds[axis + BOUNDS].values, dtype=np.float64)
    return np.append(bounds[:, 0], bounds[-1, 1])


def _cells(ds: xr.Dataset, radii: Floats) -> SphericalCells:
    latitudes = _edges(ds, LATITUDE)
    sines = np.sin(np.radians(latitudes))
    sines[0], sines[-1] = -1.0, 1.0
    size = np.unique(np.abs(latitudes))
    angles = (_edges(ds, LOCAL_TIME)[:-1] - 12.0) * math.pi / 12.0
    return SphericalCells(
        radii=radii,
        sines=sines,
        cones=np.sin(np.radians(size[(size > 0.0) & (size < 90.0)])),
        equator=bool(size[0] == 0.0),
        cosines_of_time=np.cos(angles),
        sines_of_time=np.sin(angles),
    )


def _contents(ds: xr.Dataset, radii: Floats, lines: Sequence[int], errors: bool) -> Contents:
    """Return all quantities, cells in the order of altitude, latitude, local time."""
    releases = ds.sizes[RELEASE]
    parts = [(DENSITY, ds[[name for name in (DENSITY, DENSITY + REPLICATES) if name in ds]])]
    parts += [(EMISSION, _emission(ds, line)) for line in lines]
    means = np.concatenate([_ordered(part[name]) for name, part in parts], axis=-1)
    norms, decays = reconstruct(means, radii)
    cells = int(np.prod(means.shape[:3]))
    replicates: NDArray[np.float32] = np.empty((cells, means.shape[3], 0), np.float32)
    if errors:
        _check_replicates(parts)
        # Filled one quantity at a time: with all of them side by side twice a large product would not fit.
        replicates = np.empty((cells, means.shape[3], ds.sizes[REPLICATE]), np.float32)
        for number, (name, part) in enumerate(parts):
            place = slice(number * releases, (number + 1) * releases)
            stored = part[name + REPLICATES].transpose(*CELLS, RELEASE, REPLICATE).values
            replicates[:, place] = stored.reshape(cells, releases, -1)
    flat = [np.ascontiguousarray(array.reshape(cells, -1)) for array in (means, norms, decays)]
    return Contents(releases, flat[0], flat[1], flat[2], replicates)


def _emission(ds: xr.Dataset, line: int) -> xr.Dataset:
    return ds[[name for name in (EMISSION, EMISSION + REPLICATES) if name in ds]].isel({LINE: line})


def _ordered(array: xr.DataArray) -> Floats:
    values = np.asarray(array.transpose(*CELLS, RELEASE).values, dtype=np.float64)
    if not np.all(np.isfinite(values)) or np.any(values < 0.0):
        raise InputError(f"{array.name} holds values that are negative or not finite; the product is damaged")
    return values


def _check_replicates(parts: Sequence[tuple[str, xr.Dataset]]) -> None:
    for name, part in parts:
        if name + REPLICATES not in part or part.sizes[REPLICATE] < LEAST_REPLICATES:
            raise InputError(
                f"there are no {name}{REPLICATES}, at least {LEAST_REPLICATES} of which are needed: errors of lines of "
                "sight come from replicates alone, since cells of one flight are correlated. Run again with "
                "ensemble.replicates = 20; without errors, tracer sightlines --no-errors does"
            )


def _replicate_batches(ds: xr.Dataset, groups: int) -> Floats:
    counts = np.atleast_1d(np.asarray(ds.attrs.get("replicate_batches", ()), dtype=np.float64))
    return counts if counts.size == groups else np.ones(groups)


def _ground_temperature(ds: xr.Dataset) -> float | None:
    """Return the mean temperature of the ground [K], None where the product has none."""
    if "surface_temperature" not in ds:
        return None
    temperature: Any = ds["surface_temperature"]
    return float(temperature.weighted(ds["cell_area"]).mean()) if "cell_area" in ds else None
