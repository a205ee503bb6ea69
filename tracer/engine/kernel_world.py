"""From a scene to the NamedTuples of floats and arrays that kernels take."""

from collections.abc import Sequence
from math import log

import numpy as np

from tracer.constants import BOLTZMANN
from tracer.engine.scene import Scene
from tracer.kernels.bounce import Surface
from tracer.kernels.cells import Cells, Images
from tracer.kernels.temperature import UNIFORM, SurfaceTemperature
from tracer.kernels.world import Motion, World
from tracer.tally.axes import Grid, ImagePlane
from tracer.tally.buffer import plane_shape, plane_size


def kernel_world(scene: Scene) -> World:
    """Return the kernels' view of `scene`; every number gets its final type here, so that one compilation serves."""
    return World(
        Motion(
            gm=float(scene.body.gm),
            radius=float(scene.body.radius),
            outer_radius=float(scene.outer_radius),
            frame_rate=0.0,
            age_limit=float(scene.age_limit),
            hazard=float(scene.hazard),
        ),
        Surface(
            # Nothing bounces and nothing takes the ground's temperature where none is given.
            temperature=_typed(scene.surface_temperature or SurfaceTemperature(UNIFORM, np.nan, np.nan)),
            sticking=float(scene.sticking),
            accommodation=float(scene.accommodation),
            speed_squared_per_kelvin=2.0 * BOLTZMANN / scene.mass,
            spin=float(scene.ground_spin),
        ),
        _cells(scene.grid),
        _images(scene.planes),
    )


def _typed(law: SurfaceTemperature) -> SurfaceTemperature:
    return SurfaceTemperature(int(law.law), float(law.subsolar), float(law.night))


def _cells(grid: Grid) -> Cells:
    altitudes = grid.altitude_edges
    layers = len(altitudes) - 1
    return Cells(
        radius=float(grid.body_radius),
        radii=grid.body_radius + altitudes,
        first_altitude=float(altitudes[1]),
        cells_per_log=(layers - 1) / log(altitudes[-1] / altitudes[1]) if layers > 1 else 0.0,
        latitude_cells=len(grid.latitude_edges) - 1,
        local_time_cells=len(grid.local_time_edges) - 1,
    )


def _images(planes: Sequence[ImagePlane]) -> Images:
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
        first=np.concatenate(([0], np.cumsum(sizes)))[: len(planes)].astype(np.int64),
    )


def _rows(
    vectors: Sequence[Sequence[float]], width: int
) -> "np.ndarray[tuple[int, int], np.dtype[np.float64]]":
    return np.array(vectors, dtype=np.float64).reshape(-1, width)
