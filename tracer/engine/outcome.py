"""From folded batches to the product, with all that is known about the run."""

from collections.abc import Iterator, Sequence
from pathlib import Path
from types import EllipsisType
from typing import Any, NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.engine.folding import Folder
from tracer.engine.planning import Plan
from tracer.engine.references import scene_references
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.writing import run_file_text
from tracer.engine.scene import Scene
from tracer.engine.sunlight import true_anomaly
from tracer.engine.tasks import BatchRange
from tracer.engine.velocity_fields import velocity_fields
from tracer.errors import TracerError
from tracer.fate import Fate
from tracer.kernels.scoring import Tally
from tracer.kernels.temperature import temperatures
from tracer.physics.thermal import escape_speed
from tracer.product.assembling import assemble
from tracer.product.batch_ranges import ranges_text
from tracer.product.checksum import data_checksum
from tracer.product.provenance import global_attributes
from tracer.tally.axes import direction, middles
from tracer.tally.budget import CLOSURE, budget_gap
from tracer.tally.buffer import response_views, tally_views
from tracer.tally.field import FieldStatistics
from tracer.tally.normalizing import ProductField, product_fields, response_fields
from tracer.tally.statistics import replicate_counts

Numbers = NDArray[np.float64]


class Costs(NamedTuple):
    """What a run took: `wall_seconds` from the first batch's start to the last fold, without compilation."""

    wall_seconds: float
    workers: int


def make_product(plan: Plan, folder: Folder, costs: Costs) -> xr.Dataset:
    """Return the product of a finished run.

    Raises
    ------
    TracerError
        The particle budget does not close, or the propagator gave up on an atom.
    """
    scene = plan.scene
    fields = _fields(scene, folder)
    fields |= velocity_fields(scene.planes, folder, fields)
    _check_budget(scene, fields["ledger"].mean, fields["roulette_balance"].mean)
    product = assemble(
        scene.grid,
        scene.planes,
        [release.name for release in scene.releases],
        fields,
        _plain_fields(scene),
        _attributes(plan, folder, costs),
        [line.name for line in scene.lines],
        None if plan.work.responses is None else plan.work.responses.edges,
    )
    product.attrs["data_checksum"] = data_checksum(product)
    return product


def _fields(scene: Scene, folder: Folder) -> dict[str, FieldStatistics]:
    """Return the tallied variables of all releases, each array made once and filled release by release."""
    means: dict[str, Numbers] = {}
    errors: dict[str, Numbers] = {}
    replicates: dict[str, NDArray[np.float32]] = {}
    whole = np.zeros(folder.layout.size)
    for number, one in enumerate(folder.statistics):

        def fields_of(buffer: Numbers, number: int = number) -> Iterator[ProductField]:
            views = tally_views(folder.layout, buffer)
            yield from product_fields(views, scene.grid, scene.planes, scene.releases[number].rate)
            responses = response_views(folder.layout, buffer)
            if responses is not None:
                yield from response_fields(responses, scene.grid, scene.planes)

        for field in fields_of(one.mean):
            _put(means, field, number, folder)
        for field in fields_of(one.standard_error()):
            _put(errors, field, number, folder)
        for group, row in enumerate(one.replicate_means()):
            whole[: folder.layout.replicated_size] = row
            for field in fields_of(whole):
                if field.replicated:
                    _put_replicate(replicates, field, number, group, folder)
    return {name: FieldStatistics(mean, errors[name], replicates.get(name)) for name, mean in means.items()}


def _put(made: dict[str, Numbers], field: ProductField, number: int, folder: Folder) -> None:
    if field.name not in made:
        made[field.name] = np.empty(_shape(field, folder))
    np.multiply(field.values, field.scale, out=made[field.name][_place(field, number)])


def _put_replicate(
    made: dict[str, NDArray[np.float32]], field: ProductField, number: int, group: int, folder: Folder
) -> None:
    if field.name not in made:
        groups = folder.statistics[0].groups
        made[field.name] = np.empty((groups, *_shape(field, folder)), np.float32)
    made[field.name][group][_place(field, number)] = field.values * field.scale


def _shape(field: ProductField, folder: Folder) -> tuple[int, ...]:
    """Return the shape over all releases: they stand first, behind the lines only."""
    axis = int(field.by_line)
    return (*field.values.shape[:axis], len(folder.statistics), *field.values.shape[axis:])


def _place(field: ProductField, number: int) -> tuple[slice | int | EllipsisType, ...]:
    return (*(slice(None),) * int(field.by_line), number, ...)


def _check_budget(scene: Scene, ledger: Numbers, roulette: Numbers) -> None:
    for release, fates, balance in zip(scene.releases, ledger, roulette, strict=True):
        gap = budget_gap(release.rate, fates, float(balance))
        if not gap <= CLOSURE:
            raise TracerError(
                f"the particle budget of release {release.name!r} does not close: the fates sum to {fates.sum():.12g} "
                f"of {release.rate + balance:.12g} atoms per second. "
                "This is a fault of the program, not of the run file"
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


def _attributes(plan: Plan, folder: Folder, costs: Costs) -> dict[str, Any]:
    spec, ensemble = plan.spec, plan.spec.ensemble
    batches = BatchRange(plan.batches.first, plan.batches.first + folder.batches)
    return {
        **global_attributes(
            spec.title, f"traced from {Path(spec.file).name}", tuple(scene_references(plan.scene))
        ),
        "run_file": run_file_text(spec),
        "scene_hash": plan.scene_hash,
        "run_hash": plan.run_hash,
        "seed": ensemble.seed,
        "batches": batches.batches,
        "batch_ranges": ranges_text([(ensemble.seed, *batches)]),
        **_replicate_attributes(folder),
        "particles_per_batch": ensemble.particles_per_batch,
        "flights": folder.flights,
        "integration_steps": folder.steps,
        "kernel_seconds": folder.kernel_seconds,
        "wall_seconds": costs.wall_seconds,
        "workers": costs.workers,
        "body_radius": plan.scene.body.radius,
        **_sun_attributes(plan.spec, plan.scene, folder),
        **_host_attributes(plan.scene),
        **_stop_attributes(plan, folder),
        **_response_attributes(plan.scene),
        "complete": 1,
    }


def _replicate_attributes(folder: Folder) -> dict[str, Any]:
    """Return how many batches count into each replicate, in the order of the product's replicates."""
    one = folder.statistics[0]
    counts = replicate_counts(one.first_batch, one.batches, len(one.replicate_sum))
    kept = [count for count in counts if count]
    return {"replicate_batches": np.array(kept, dtype=np.int64)} if kept else {}


def _stop_attributes(plan: Plan, folder: Folder) -> dict[str, Any]:
    """Return whether the run was good enough when it ended; nothing where it was not asked to be."""
    if plan.rule is None:
        return {}
    return {"stop_reached": int(folder.reached), "stop_relative_error": folder.relative_error()}


def _response_attributes(scene: Scene) -> dict[str, Any]:
    """Return what else a law of speed needs to be put together from responses; nothing where none are kept."""
    if not scene.speed_bins:
        return {}
    return {"atom_mass": scene.mass, "escape_speed": escape_speed(scene.body.gm, scene.body.radius)}


def _sun_attributes(spec: RunSpec, scene: Scene, folder: Folder) -> dict[str, Any]:
    """Return where the body stood in sunlight, and the share of survival time beyond the end of a line's table."""
    if scene.sun is None:
        return {}
    station = scene.sun.station
    anomaly = true_anomaly(spec)
    tallies = [tally_views(folder.layout, one.mean) for one in folder.statistics]
    return {
        **({} if anomaly is None else {"true_anomaly": anomaly}),
        "sun_distance": station.distance,
        "sun_radial_velocity": station.radial_velocity,
        "orbital_rate": station.orbital_rate,
        "share_beyond_line_tables": np.array([_share_beyond(scene, one) for one in tallies]),
        **_motion_attributes(scene, tallies),
    }


def _host_attributes(scene: Scene) -> dict[str, Any]:
    """Return where the host stands [m] in the moon's Sun-fixed frame, its phase angle [deg] and radius [m]."""
    host, moon = scene.body.host, scene.moon
    if host is None or moon is None:
        return {}
    return {
        "host": host.name,
        "host_radius": host.radius,
        "host_position": np.array(moon.host),
        "phase_angle": moon.phase_angle,
        "frame_rate": scene.frame_rate,
    }


def _share_beyond(scene: Scene, tally: Tally) -> float:
    content = float((tally.life if scene.event_window is None else tally.aloft)[0])
    return float(tally.beyond[0]) / content if content else 0.0


def _motion_attributes(scene: Scene, tallies: Sequence[Tally]) -> dict[str, Any]:
    """Return how the body moves, and where it does the window of the fluxes and what the limit of age leaves out."""
    if scene.event_window is None:
        return {"motion": "stationary"}
    return {
        "motion": "moving",
        "event_window": scene.event_window,
        "share_older_than_age_limit": np.array(
            [float(one.older[0] / (one.life[0] + one.older[0])) for one in tallies]
        ),
    }
