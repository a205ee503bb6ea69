"""From a scene to the NamedTuples of floats and arrays that kernels take."""

from collections.abc import Sequence
from math import log, nan

import numpy as np

from tracer.constants import ASTRONOMICAL_UNIT, BOLTZMANN
from tracer.engine.ground import ColdTraps
from tracer.engine.scene import Release, Scene
from tracer.engine.sunlight import NO_PHOTO_LOSS, Sunlight
from tracer.kernels.adsorption import Adsorption
from tracer.kernels.bounce import Surface
from tracer.kernels.cells import Cells, Images, Velocities, make_cells
from tracer.kernels.host import Host, HostOrbit
from tracer.kernels.motion import Losses
from tracer.kernels.quantiles import quantile_nodes
from tracer.kernels.roulette import WEIGHTED
from tracer.kernels.step_control import DEFAULT_TOLERANCE
from tracer.kernels.sticking import Sticking
from tracer.kernels.surface_map import SurfaceMap
from tracer.kernels.temperature import UNIFORM, SurfaceTemperature
from tracer.kernels.traps import MAPPED, NOWHERE, POLEWARD, Traps
from tracer.kernels.world import Light, Motion, Snapshot, World
from tracer.physics.host import moving_host, still_host
from tracer.physics.lines import line_tables, push_tables
from tracer.physics.orbit import Station
from tracer.physics.sunlight import conditions_of, forces_of, losses_of, shadow_of
from tracer.tally.axes import Grid, ImagePlane
from tracer.tally.buffer import plane_shape, plane_size, velocity_middle, velocity_sums


def kernel_world(scene: Scene) -> World:
    """Return the kernels' view of `scene`; every number gets its final type here, so that one compilation serves."""
    return World(
        Motion(
            gm=float(scene.body.gm),
            radius=float(scene.body.radius),
            outer_radius=float(scene.outer_radius),
            frame_rate=float(scene.frame_rate),
            age_limit=float(scene.age_limit),
            hazard=float(scene.constant_hazard),
        ),
        Surface(
            # Nothing bounces and nothing takes the ground's temperature where none is given.
            temperature=_typed(scene.surface_temperature or SurfaceTemperature(UNIFORM, np.nan, np.nan)),
            sticking=Sticking(*map(float, scene.sticking)),
            accommodation=float(scene.accommodation),
            speed_squared_per_kelvin=2.0 * BOLTZMANN / scene.mass,
            spin=float(scene.ground_spin),
        ),
        _adsorption(scene),
        _traps(scene.cold_traps),
        WEIGHTED,
        _cells(scene.grid),
        _images(scene.planes, scene.frame_rate),
        _light(scene),
        integrated=bool(scene.integrated),
        snapshot=_snapshot(scene),
    )


def world_of_release(world: World, release: Release) -> World:
    """Return `world` as `release` has it: around a moving body, with or without a rate that follows the distance."""
    if world.snapshot is None:
        return world
    return world._replace(snapshot=world.snapshot._replace(follows_distance=float(release.follows_distance)))


def _snapshot(scene: Scene) -> Snapshot | None:
    if scene.event_window is None:
        return None
    return Snapshot(
        window=float(scene.event_window),
        ground_turns=float(scene.body.rotation_period is not None),
        follows_distance=0.0,
    )


def _adsorption(scene: Scene) -> Adsorption:
    """Return what holds adsorbed atoms; those kept for good never ask for its numbers."""
    law = scene.desorption
    if law is None:
        return Adsorption(False, nan, nan, 0.0, np.zeros(2), False)
    speeds, thermal = np.zeros(2), False
    if law.photon is not None:
        u = quantile_nodes()
        # The speeds of a law that takes the ground's temperature go with its root; other laws do not look at it.
        speeds, warmer = (
            law.photon.speed.speeds(u, np.full(len(u), kelvin), scene.mass) for kelvin in (1.0, 4.0)
        )
        thermal = not np.array_equal(speeds, warmer)
    return Adsorption(
        desorbs=True,
        binding_kelvin=float(law.energy / BOLTZMANN),
        log_frequency=log(law.attempt_frequency),
        photon_rate=0.0 if law.photon is None else float(law.photon.rate),
        photon_speeds=np.ascontiguousarray(speeds),
        photon_speeds_are_thermal=thermal,
    )


def _traps(traps: ColdTraps | None) -> Traps:
    nothing = SurfaceMap(np.zeros(2), np.zeros(2), np.zeros((2, 2)))
    if traps is None:
        return Traps(NOWHERE, 2.0, nothing)
    if traps.probability is not None:
        return Traps(MAPPED, 2.0, traps.probability)
    assert traps.least_sine is not None
    return Traps(POLEWARD, float(traps.least_sine), nothing)


def _light(scene: Scene) -> Light:
    """Return what integrated flights need; without a Sun the numbers are never used, but must have their types."""
    sun = scene.sun or _NO_SUN
    body, moon = scene.body, scene.moon
    station = sun.station
    if moon is not None:
        moves = sun.orbit is not None
        station = moon.host_station if moves else station._replace(orbital_rate=scene.frame_rate)
    forces = forces_of(
        gm=body.gm,
        radius=body.radius,
        outer_radius=scene.outer_radius,
        station=station,
        tide=sun.tide,
        push=sun.push,
        orbit=sun.orbit,
        host=_host(scene, sun),
    )
    pushing = push_tables(sun.lines if sun.lines_push else (), scene.mass)
    shadow = shadow_of(sun.shadow, body.radius, sun.station.distance)
    conditions = conditions_of(forces, _losses(scene, sun), shadow, pushing)
    return Light(conditions, line_tables(sun.lines), DEFAULT_TOLERANCE)


def _host(scene: Scene, sun: Sunlight) -> Host | HostOrbit | None:
    """Return the host as it moves, or as it keeps its place; it casts a shadow if the body does."""
    host, moon, casts = scene.body.host, scene.moon, sun.shadow != "none"
    if host is None or moon is None:
        return None
    if sun.orbit is None:
        return still_host(host.gm, host.radius, moon, casts)
    return moving_host(host.gm, host.radius, moon, sun.orbit, casts)


def _losses(scene: Scene, sun: Sunlight) -> Losses:
    """Return the losses summed by how they depend on distance and light."""
    sums = {(True, True): sun.photo.other, (False, True): 0.0, (True, False): 0.0, (False, False): 0.0}
    for loss in scene.losses:
        sums[loss.inverse_square, loss.in_sunlight] += loss.rate
    return losses_of(
        ionizing=sun.photo.ionizing,
        other_sunlight=sums[True, True],
        other_lit=sums[False, True],
        other_distance=sums[True, False],
        other_everywhere=sums[False, False],
    )


_NO_SUN = Sunlight(Station(ASTRONOMICAL_UNIT, 0.0, 0.0), None, False, "none", (), False, 0.0, NO_PHOTO_LOSS)


def _typed(law: SurfaceTemperature) -> SurfaceTemperature:
    table = SurfaceMap(*(np.ascontiguousarray(part, dtype=np.float64) for part in law.table))
    return SurfaceTemperature(int(law.law), float(law.subsolar), float(law.night), table)


def _cells(grid: Grid) -> Cells:
    altitudes = grid.altitude_edges
    layers = len(altitudes) - 1
    return make_cells(
        radius=float(grid.body_radius),
        radii=grid.body_radius + altitudes,
        first_altitude=float(altitudes[1]),
        cells_per_log=(layers - 1) / log(altitudes[-1] / altitudes[1]) if layers > 1 else 0.0,
        latitude_cells=len(grid.latitude_edges) - 1,
        local_time_cells=len(grid.local_time_edges) - 1,
    )


def _images(planes: Sequence[ImagePlane], turning: float) -> Images:
    shapes = np.array([plane_shape(plane) for plane in planes], dtype=np.int64).reshape(-1, 2)
    sizes = np.array([plane_size(plane) for plane in planes], dtype=np.int64)
    low = [(plane.horizontal_edges[0], plane.vertical_edges[0]) for plane in planes]
    pixel = [
        (
            plane.horizontal_edges[1] - plane.horizontal_edges[0],
            plane.vertical_edges[1] - plane.vertical_edges[0],
        )
        for plane in planes
    ]
    return Images(
        toward_viewer=_rows([plane.toward_viewer for plane in planes], 3),
        right=_rows([plane.right for plane in planes], 3),
        up=_rows([plane.up for plane in planes], 3),
        low=_rows(low, 2),
        pixel=_rows(pixel, 2),
        columns=shapes[:, 1].copy(),
        rows=shapes[:, 0].copy(),
        first=_begins(sizes),
        velocities=_velocities(planes, sizes, turning),
    )


def _velocities(
    planes: Sequence[ImagePlane], sizes: "np.ndarray[tuple[int], np.dtype[np.int64]]", turning: float
) -> Velocities:
    nothing = np.array([0.0, 1.0])
    edges = [nothing if plane.velocity_edges is None else plane.velocity_edges for plane in planes]
    sums = np.array([velocity_sums(plane) for plane in planes], dtype=np.int64)
    return Velocities(
        turning=float(turning),
        low=np.array([one[0] for one in edges], dtype=np.float64),
        width=np.array([(one[-1] - one[0]) / (len(one) - 1) for one in edges], dtype=np.float64),
        middle=np.array([velocity_middle(plane) for plane in planes], dtype=np.float64),
        bins=np.maximum(sums - 3, 0),
        first=_begins(sizes * sums),
        resolved=bool(sums.any()),
    )


def _begins(
    sizes: "np.ndarray[tuple[int], np.dtype[np.int64]]",
) -> "np.ndarray[tuple[int], np.dtype[np.int64]]":
    """Return where each part begins in an array that holds parts of these sizes one after the other."""
    return np.concatenate(([0], np.cumsum(sizes)))[: len(sizes)].astype(np.int64)


def _rows(
    vectors: Sequence[Sequence[float]], width: int
) -> "np.ndarray[tuple[int, int], np.dtype[np.float64]]":
    return np.array(vectors, dtype=np.float64).reshape(-1, width)
