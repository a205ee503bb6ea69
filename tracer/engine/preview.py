"""What a run would do, without running it: the resolved scene in figures."""

from typing import NamedTuple

import numpy as np

from tracer.engine.batches import make_work
from tracer.engine.body_constants import overridden_constants
from tracer.engine.executors.threads import WINDOW
from tracer.engine.launching import draw_launches
from tracer.engine.runspec.run import RunSpec
from tracer.engine.scene import Release, Scene
from tracer.kernels.arc_flight import CROSSED, LANDED
from tracer.kernels.hops import single_hops
from tracer.kernels.temperature import temperatures
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.physics.release.speed.maxwell_gas import MaxwellGas
from tracer.physics.thermal import (
    escape_speed,
    jeans_parameter,
    mean_speed,
    most_probable_speed,
    rms_speed,
    scale_height,
    surface_gravity,
)

TRIAL_LAUNCHES = 20_000
TRIAL_SEED = 1
FLOAT_BYTES = 8
REPLICATE_BYTES = 4

HYDRODYNAMIC_JEANS = 3.0
"""Below this jeans parameter a real gas flows out and needs collisions (Volkov et al. 2011, ApJ 729, L24)."""


class ReleasePreview(NamedTuple):
    """One release; what has no meaning for its speed law is None.

    `temperature` [K] of the law, or the mean of the ground's over the places of release; the three speeds of a gas of
    that temperature, `launch_speed` the law's own mean [m s-1]; medians of `hop_time` [s] and `hop_range` [m] over the
    trial launches that land, None where none does; `crossing_fraction` of the trial launches cross the outer radius.
    """

    name: str
    rate: float
    temperature: float | None
    most_probable_speed: float | None
    mean_speed: float | None
    rms_speed: float | None
    launch_speed: float
    jeans_parameter: float | None
    scale_height: float | None
    hop_time: float | None
    hop_range: float | None
    crossing_fraction: float


class Preview(NamedTuple):
    """The resolved scene in SI units; `memory` and `product_size` [bytes] are what to expect at the most."""

    propagator: str
    radius: float
    gm: float
    surface_gravity: float
    escape_speed: float
    rotation_period: float | None
    outer_radius: float
    age_limit: float
    mass: float
    loss_rate: float
    releases: tuple[ReleasePreview, ...]
    particles: int
    memory: int
    product_size: int
    notes: tuple[str, ...]


def preview(spec: RunSpec, scene: Scene, workers: int) -> Preview:
    """Return the figures of `scene`, for a run on `workers` threads."""
    body = scene.body
    releases = tuple(_preview_release(scene, release) for release in scene.releases)
    memory, product_size = _sizes(spec, scene, workers)
    return Preview(
        propagator="closed-form Kepler arcs",
        radius=body.radius,
        gm=body.gm,
        surface_gravity=surface_gravity(body.gm, body.radius),
        escape_speed=escape_speed(body.gm, body.radius),
        rotation_period=body.rotation_period,
        outer_radius=scene.outer_radius,
        age_limit=scene.age_limit,
        mass=scene.mass,
        loss_rate=scene.hazard,
        releases=releases,
        particles=spec.ensemble.particles_per_batch * spec.ensemble.batches * len(releases),
        memory=memory,
        product_size=product_size,
        notes=(*_override_notes(spec), *_outflow_notes(releases)),
    )


def _preview_release(scene: Scene, release: Release) -> ReleasePreview:
    rng = np.random.default_rng(TRIAL_SEED)
    launches = draw_launches(scene, release, TRIAL_LAUNCHES, rng)
    motion = make_work(scene, 0, 1).world.motion
    endings, durations, arcs, _ = single_hops(motion, *launches)
    landed = endings == LANDED
    ground = _ground_temperature(scene, launches.positions)
    kelvin = _law_temperature(release, ground)
    body, mass = scene.body, scene.mass
    return ReleasePreview(
        name=release.name,
        rate=release.rate,
        temperature=kelvin,
        most_probable_speed=None if kelvin is None else most_probable_speed(kelvin, mass),
        mean_speed=None if kelvin is None else mean_speed(kelvin, mass),
        rms_speed=None if kelvin is None else rms_speed(kelvin, mass),
        launch_speed=release.speed.mean_speed(np.nan if ground is None else ground, mass),
        jeans_parameter=None if kelvin is None else jeans_parameter(body.gm, body.radius, kelvin, mass),
        scale_height=None
        if kelvin is None or body.gm == 0.0
        else scale_height(body.gm, body.radius, kelvin, mass),
        hop_time=float(np.median(durations[landed])) if landed.any() else None,
        hop_range=float(np.median(arcs[landed])) * body.radius if landed.any() else None,
        crossing_fraction=float(np.mean(endings == CROSSED)),
    )


def _ground_temperature(
    scene: Scene, places: "np.ndarray[tuple[int, ...], np.dtype[np.float64]]"
) -> float | None:
    if scene.surface_temperature is None:
        return None
    return float(np.mean(temperatures(scene.surface_temperature, places)))


def _law_temperature(release: Release, ground: float | None) -> float | None:
    if not isinstance(release.speed, MaxwellFlux | MaxwellGas):
        return None
    return ground if release.speed.temperature is None else release.speed.temperature


def _sizes(spec: RunSpec, scene: Scene, workers: int) -> tuple[int, int]:
    """Return (memory, product size) [bytes]: buffers under way and folded, and the product uncompressed."""
    layout = make_work(scene, 0, 1).layout
    releases = len(scene.releases)
    replicates = min(spec.ensemble.replicates, spec.ensemble.batches)
    kept = replicates * layout.replicated_size
    product = releases * (2 * layout.size * FLOAT_BYTES + kept * REPLICATE_BYTES)
    folded = releases * (2 * layout.size + kept) * FLOAT_BYTES
    under_way = (WINDOW * workers + 1) * layout.size * FLOAT_BYTES
    # While the product is put together, the replicates exist in double precision once more.
    return folded + under_way + product + releases * kept * FLOAT_BYTES, product


def _override_notes(spec: RunSpec) -> tuple[str, ...]:
    keys = overridden_constants(spec)
    if not keys:
        return ()
    return (f"body: {', '.join(keys)} from the run file replace the catalogue's values of {spec.body.name}",)


def _outflow_notes(releases: tuple[ReleasePreview, ...]) -> tuple[str, ...]:
    return tuple(
        f"release {one.name!r}: the jeans parameter {one.jeans_parameter:.3g} is below {HYDRODYNAMIC_JEANS:g}, where a "
        "real gas flows out and collisions matter: outside the model unless the gas is very thin"
        for one in releases
        if one.jeans_parameter is not None and one.jeans_parameter < HYDRODYNAMIC_JEANS
    )
