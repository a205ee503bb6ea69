"""From folded batches to the product, with all that is known about the run."""

from collections.abc import Iterator
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.engine.folding import Folder
from tracer.engine.hashing import run_hash, scene_hash
from tracer.engine.references import scene_references
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.writing import run_file_text
from tracer.engine.scene import Release, Scene, referenced_files
from tracer.errors import TracerError
from tracer.fate import Fate
from tracer.kernels.temperature import temperatures
from tracer.product.assembling import assemble
from tracer.product.checksum import data_checksum
from tracer.product.layout import has_lines
from tracer.product.provenance import global_attributes
from tracer.tally.axes import direction, middles
from tracer.tally.budget import CLOSURE, budget_gap
from tracer.tally.buffer import BufferLayout, tally_views
from tracer.tally.field import FieldStatistics
from tracer.tally.normalizing import ProductField, product_fields
from tracer.tally.statistics import BatchStatistics


class Costs(NamedTuple):
    """What a run took: `wall_seconds` from the first batch's start to the last fold, without compilation."""

    wall_seconds: float
    workers: int


def make_product(spec: RunSpec, scene: Scene, folder: Folder, costs: Costs) -> xr.Dataset:
    """Return the product of a finished run.

    Raises
    ------
    TracerError
        The particle budget does not close, or the propagator gave up on an atom.
    """
    each = [
        _release_fields(scene, folder.layout, release, one)
        for release, one in zip(scene.releases, folder.statistics, strict=True)
    ]
    fields = {name: _stacked([one[name] for one in each], has_lines(name)) for name in each[0]}
    _check_budget(scene, fields["ledger"].mean)
    product = assemble(
        scene.grid,
        scene.planes,
        [release.name for release in scene.releases],
        fields,
        _plain_fields(scene),
        _attributes(spec, scene, folder, costs),
        [line.name for line in scene.lines],
    )
    product.attrs["data_checksum"] = data_checksum(product)
    return product


def _release_fields(
    scene: Scene, layout: BufferLayout, release: Release, statistics: BatchStatistics
) -> dict[str, FieldStatistics]:
    def fields_of(buffer: NDArray[np.float64]) -> Iterator[ProductField]:
        return product_fields(tally_views(layout, buffer), scene.grid, scene.planes, release.rate)

    replicates: dict[str, list[NDArray[np.float64]]] = {}
    whole = np.zeros(layout.size)
    for group in statistics.replicate_means():
        whole[: layout.replicated_size] = group
        for field in fields_of(whole):
            if field.replicated:
                replicates.setdefault(field.name, []).append(field.values * field.scale)
    return {
        mean.name: FieldStatistics(
            mean.values * mean.scale,
            error.values * error.scale,
            np.stack(replicates[mean.name]) if mean.name in replicates else None,
        )
        for mean, error in zip(
            fields_of(statistics.mean), fields_of(statistics.standard_error()), strict=True
        )
    }


def _stacked(releases: list[FieldStatistics], by_line: bool) -> FieldStatistics:
    """Put the releases side by side: along the first axis, behind those of lines and replicates."""
    axis = int(by_line)
    kept = [one.replicates for one in releases if one.replicates is not None]
    return FieldStatistics(
        np.stack([one.mean for one in releases], axis=axis),
        np.stack([one.standard_error for one in releases], axis=axis),
        np.stack(kept, axis=axis + 1) if kept else None,
    )


def _check_budget(scene: Scene, ledger: NDArray[np.float64]) -> None:
    for release, fates in zip(scene.releases, ledger, strict=True):
        gap = budget_gap(release.rate, fates)
        if not gap <= CLOSURE:
            raise TracerError(
                f"the particle budget of release {release.name!r} does not close: the fates sum to {fates.sum():.12g} "
                f"of {release.rate:.12g} atoms per second. This is a fault of the program, not of the run file"
            )
        if fates[Fate.UNRESOLVED] != 0.0:
            raise TracerError(
                f"the propagator gave up on {fates[Fate.UNRESOLVED] / release.rate:.3g} of the atoms of release "
                f"{release.name!r}. This is a fault of the program, not of the run file"
            )


def _plain_fields(scene: Scene) -> dict[str, NDArray[np.float64]]:
    if scene.surface_temperature is None:
        return {}
    latitudes, local_times = middles(scene.grid.latitude_edges), middles(scene.grid.local_time_edges)
    places = np.array([direction(latitude, hour) for latitude in latitudes for hour in local_times])
    kelvin = temperatures(scene.surface_temperature, places)
    return {"surface_temperature": kelvin.reshape(len(latitudes), len(local_times))}


def _attributes(spec: RunSpec, scene: Scene, folder: Folder, costs: Costs) -> dict[str, Any]:
    ensemble = spec.ensemble
    scene_digest = scene_hash(scene, referenced_files(spec))
    return {
        **global_attributes(
            spec.title, f"traced from {Path(spec.file).name}", tuple(scene_references(scene))
        ),
        "run_file": run_file_text(spec),
        "scene_hash": scene_digest,
        "run_hash": run_hash(scene_digest, ensemble.seed, ensemble.particles_per_batch),
        "seed": ensemble.seed,
        "batches": ensemble.batches,
        "particles_per_batch": ensemble.particles_per_batch,
        "flights": folder.flights,
        "integration_steps": folder.steps,
        "kernel_seconds": folder.kernel_seconds,
        "wall_seconds": costs.wall_seconds,
        "workers": costs.workers,
        "body_radius": scene.body.radius,
        **_sun_attributes(scene, folder),
        "complete": 1,
    }


def _sun_attributes(scene: Scene, folder: Folder) -> dict[str, Any]:
    """Return where the body stood in sunlight, and the share of survival time beyond the end of a line's table."""
    if scene.sun is None:
        return {}
    station = scene.sun.station
    tallies = [tally_views(folder.layout, one.mean) for one in folder.statistics]
    return {
        "sun_distance": station.distance,
        "sun_radial_velocity": station.radial_velocity,
        "orbital_rate": station.orbital_rate,
        "share_beyond_line_tables": np.array([float(one.beyond[0] / one.life[0]) for one in tallies]),
    }
