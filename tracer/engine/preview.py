"""What a run would do, without running it: the resolved scene in figures."""

import math
from collections.abc import Iterator
from typing import NamedTuple

import numpy as np

from tracer.constants import ASTRONOMICAL_UNIT, BOLTZMANN
from tracer.engine.batches import make_work
from tracer.engine.emphasis import rarest_launch
from tracer.engine.launching import draw_launches, ground_velocities
from tracer.engine.memory import GIGABYTE, available_memory, sizes
from tracer.engine.notes import scene_notes
from tracer.engine.planning import make_plan
from tracer.engine.runspec.moment import moment_text
from tracer.engine.runspec.run import RunSpec
from tracer.engine.scene import Release, Scene
from tracer.engine.sunlight import Sunlight, lines_without_g, true_anomaly
from tracer.engine.surface_preview import SurfacePreview, preview_surface
from tracer.kernels.endings import CROSSED, LANDED
from tracer.kernels.hops import single_hops
from tracer.kernels.host import Host, shadow_heights, sun_past
from tracer.kernels.temperature import temperatures
from tracer.physics.host import still_host
from tracer.physics.lines import line_acceleration
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.physics.release.speed.maxwell_gas import MaxwellGas
from tracer.physics.retention import HYDRODYNAMIC_JEANS
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

EQUATOR = {
    "noon": (1.0, 0.0, 0.0),
    "dusk": (0.0, 1.0, 0.0),
    "midnight": (-1.0, 0.0, 0.0),
    "dawn": (0.0, -1.0, 0.0),
}
"""Unit vectors of the places whose residence times are shown."""

ARCS = "closed-form Kepler arcs"
INTEGRATOR = "adaptive integration (Runge-Kutta 5(4))"


class ReleasePreview(NamedTuple):
    """One release; what has no meaning for its speed law is None.

    `temperature` [K] of the law, or the mean of the ground's over the places of release; the three speeds of a gas,
    the jeans parameter and the scale height are those of that temperature; `launch_speed` [m s-1] is the mean of the
    trial launches; medians of `hop_time` [s] and `hop_range` [m] over the
    trial launches that land, None where none does; `crossing_fraction` of the trial launches cross the outer radius.
    Trial launches fly under gravity alone. `rarest_launch` is the share of the fastest launches that emphasis "far"
    tells apart, None with emphasis "even".
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
    rarest_launch: float | None


class SunPreview(NamedTuple):
    """The body in sunlight.

    `epoch` in UTC, None where the run file gives none; `true_anomaly` [deg], None where it gives the distance;
    `distance` [m], heliocentric `radial_velocity` and `orbital_rate` [rad s-1] of the body; `radiation_acceleration`
    [m s-2] of an atom at rest on the body, and its ratio to the surface gravity, None without gravity; `photo_lifetime`
    [s] of an atom in full sunlight there, None where sunlight destroys none. `motion` is the run file's word;
    `event_window` [s] is the time before the stated position in which events count, None where the body stands still.
    """

    epoch: str | None
    true_anomaly: float | None
    distance: float
    radial_velocity: float
    orbital_rate: float
    radiation_acceleration: float
    radiation_acceleration_over_gravity: float | None
    photo_lifetime: float | None
    motion: str
    event_window: float | None
    lines: tuple[str, ...]
    lines_without_g: tuple[str, ...]


class HostPreview(NamedTuple):
    """The host of a moon.

    `host` is its name, `host_gm` [m3 s-2], `host_radius` and `host_distance` [m], `host_period` [s] in which its
    direction turns once among the stars, as at the stated position; `phase_angle` [deg] and `host_latitude` [deg] of
    its place, seen from the moon; `transverse_velocity` [m s-1] of the moon about the Sun. `sun_past_host` is the part
    of the Sun's disc that the host leaves to be seen from the moon's centre, `eclipse` the word for the whole moon:
    both None without a Sun or a shadow.
    """

    host: str
    host_gm: float
    host_radius: float
    host_distance: float
    host_period: float
    phase_angle: float
    host_latitude: float
    transverse_velocity: float | None
    sun_past_host: float | None
    eclipse: str | None


class ResidencePreview(NamedTuple):
    """How long the ground holds an atom at one place of the equator: `temperature` [K], `residence_time` [s].

    That is exp(E/kT)/frequency, as if the place kept its temperature; infinite where no number can hold it.
    """

    place: str
    temperature: float
    residence_time: float


class Preview(NamedTuple):
    """The resolved scene in SI units; `memory` and `product_size` [bytes] are what to expect at the most.

    `residence` is empty where adsorbed atoms are kept for good; `photon_desorption_rate` [s-1] that of sunlight from
    overhead, None where it frees none. `sun` is None where there is no Sun; `loss_rate` [s-1] is that of losses that
    act everywhere alike.
    """

    body: str
    species: str
    propagator: str
    sun: SunPreview | None
    host: HostPreview | None
    surface: SurfacePreview
    radius: float
    gm: float
    surface_gravity: float
    escape_speed: float
    rotation_period: float | None
    outer_radius: float
    outer_radius_is_hill_radius: bool
    age_limit: float
    mass: float
    loss_rate: float
    residence: tuple[ResidencePreview, ...]
    photon_desorption_rate: float | None
    releases: tuple[ReleasePreview, ...]
    particles: int
    batches: int
    seed: int
    emphasis: str
    speed_bins: int
    fastest_bin: float | None
    memory: int
    product_size: int
    notes: tuple[str, ...]


def preview(spec: RunSpec, scene: Scene, workers: int) -> Preview:
    """Return the figures of `scene`, for a run on `workers` threads."""
    body = scene.body
    releases = tuple(_preview_release(scene, release) for release in scene.releases)
    plan = make_plan(spec, scene)
    memory, product_size = sizes(plan, workers)
    responses = plan.work.responses
    return Preview(
        body=spec.body.name,
        species=spec.gas.species,
        propagator=INTEGRATOR if scene.integrated else ARCS,
        sun=None if scene.sun is None else _preview_sun(spec, scene, scene.sun),
        host=_preview_host(scene),
        surface=preview_surface(spec, scene),
        radius=body.radius,
        gm=body.gm,
        surface_gravity=surface_gravity(body.gm, body.radius),
        escape_speed=escape_speed(body.gm, body.radius),
        rotation_period=body.rotation_period,
        outer_radius=scene.outer_radius,
        outer_radius_is_hill_radius=spec.domain.outer_radius is None,
        age_limit=scene.age_limit,
        mass=scene.mass,
        loss_rate=scene.constant_hazard,
        residence=tuple(_preview_residence(scene)),
        photon_desorption_rate=_photon_desorption_rate(scene),
        releases=releases,
        particles=spec.ensemble.particles_per_batch * spec.ensemble.most_batches * len(releases),
        batches=spec.ensemble.most_batches,
        seed=spec.ensemble.seed,
        emphasis=scene.emphasis,
        speed_bins=scene.speed_bins,
        fastest_bin=None if responses is None else float(responses.edges[-1]),
        memory=memory,
        product_size=product_size,
        notes=(*scene_notes(spec, scene), *_outflow_notes(releases), *_memory_notes(memory)),
    )


def _preview_sun(spec: RunSpec, scene: Scene, sun: Sunlight) -> SunPreview:
    dilution = (ASTRONOMICAL_UNIT / sun.station.distance) ** 2
    pushing = sun.lines if sun.lines_push else ()
    push = dilution * (sun.push + float(line_acceleration(pushing, scene.mass, sun.station.radial_velocity)))
    gravity = surface_gravity(scene.body.gm, scene.body.radius)
    return SunPreview(
        epoch=None if spec.sun is None or spec.sun.epoch is None else moment_text(spec.sun.epoch),
        true_anomaly=true_anomaly(spec),
        distance=sun.station.distance,
        radial_velocity=sun.station.radial_velocity,
        orbital_rate=sun.station.orbital_rate,
        radiation_acceleration=push,
        radiation_acceleration_over_gravity=push / gravity if gravity else None,
        photo_lifetime=1.0 / (dilution * sun.photo.total) if sun.photo.total else None,
        motion="stationary" if sun.orbit is None else "moving",
        event_window=scene.event_window,
        lines=tuple(line.name for line in sun.lines),
        lines_without_g=lines_without_g(spec),
    )


def _preview_host(scene: Scene) -> HostPreview | None:
    host, moon, sun = scene.body.host, scene.moon, scene.sun
    if host is None or moon is None:
        return None
    shadow = None
    if sun is not None and sun.shadow != "none":
        shadow = still_host(host.gm, host.radius, moon, True)
    return HostPreview(
        host=host.name,
        host_gm=host.gm,
        host_radius=host.radius,
        host_distance=moon.distance,
        host_period=2.0 * math.pi / moon.rate,
        phase_angle=moon.phase_angle,
        host_latitude=math.degrees(math.asin(moon.host[2] / moon.distance)),
        transverse_velocity=None if sun is None else moon.station.orbital_rate * moon.station.distance,
        sun_past_host=None if shadow is None else sun_past(shadow, 0.0, 0.0, 0.0),
        eclipse=None if shadow is None else _eclipse(shadow, scene.body.radius),
    )


def _eclipse(host: Host, radius: float) -> str:
    """Return how a moon of `radius` [m] lies in the shadow of `host`."""
    penumbra, umbra = shadow_heights(host, 0.0, 0.0, 0.0)
    if penumbra >= radius:
        return "none"
    if umbra <= -radius:
        return "total"
    return "partial" if umbra < radius else "penumbral"


def _preview_residence(scene: Scene) -> Iterator[ResidencePreview]:
    law, kelvins = scene.desorption, scene.surface_temperature
    if law is None or kelvins is None:
        return
    for place, at in EQUATOR.items():
        kelvin = float(temperatures(kelvins, np.array([at]))[0])
        with np.errstate(over="ignore"):
            time = float(np.exp(law.energy / (BOLTZMANN * kelvin)) / law.attempt_frequency)
        yield ResidencePreview(place, kelvin, time)


def _photon_desorption_rate(scene: Scene) -> float | None:
    if scene.desorption is None or scene.desorption.photon is None:
        return None
    return scene.desorption.photon.rate


def _preview_release(scene: Scene, release: Release) -> ReleasePreview:
    launches = draw_launches(scene, release, TRIAL_LAUNCHES, np.random.default_rng(TRIAL_SEED), 1.0)
    motion = make_work(scene._replace(speed_bins=0), 0, 1).world.motion
    endings, durations, arcs, _ = single_hops(
        motion, launches.positions, launches.velocities + ground_velocities(scene, launches.positions)
    )
    landed = endings == LANDED
    ground = _ground_temperature(scene, launches.positions)
    kelvin = _law_temperature(release, ground)
    return ReleasePreview(
        name=release.name,
        rate=release.rate,
        temperature=kelvin,
        launch_speed=float(np.mean(np.linalg.norm(launches.velocities, axis=1))),
        **_thermal_figures(scene, kelvin),
        hop_time=float(np.median(durations[landed])) if landed.any() else None,
        hop_range=float(np.median(arcs[landed])) * scene.body.radius if landed.any() else None,
        crossing_fraction=float(np.mean(endings == CROSSED)),
        rarest_launch=None if scene.emphasis == "even" else rarest_launch(scene, release),
    )


def _thermal_figures(scene: Scene, kelvin: float | None) -> dict[str, float | None]:
    """Return what a gas of temperature `kelvin` does on the body; all None for a law without temperature."""
    body, mass = scene.body, scene.mass
    if kelvin is None:
        names = ("most_probable_speed", "mean_speed", "rms_speed", "jeans_parameter", "scale_height")
        return dict.fromkeys(names)
    return {
        "most_probable_speed": most_probable_speed(kelvin, mass),
        "mean_speed": mean_speed(kelvin, mass),
        "rms_speed": rms_speed(kelvin, mass),
        "jeans_parameter": jeans_parameter(body.gm, body.radius, kelvin, mass),
        "scale_height": scale_height(body.gm, body.radius, kelvin, mass) if body.gm else None,
    }


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


def _memory_notes(needed: int) -> Iterator[str]:
    there = available_memory()
    if there is not None and needed > there:
        yield (
            f"{needed / GIGABYTE:.3g} GB of memory are more than the {there / GIGABYTE:.3g} GB available here: "
            "the run would be refused"
        )


def _outflow_notes(releases: tuple[ReleasePreview, ...]) -> tuple[str, ...]:
    return tuple(
        f"release {one.name!r}: the jeans parameter {one.jeans_parameter:.3g} is below {HYDRODYNAMIC_JEANS:g}, where a "
        "real gas flows out and collisions matter: outside the model unless the gas is very thin"
        for one in releases
        if one.jeans_parameter is not None and one.jeans_parameter < HYDRODYNAMIC_JEANS
    )
