"""What a user should know about a scene before believing its results."""

from collections.abc import Iterator

import numpy as np

from tracer.catalogue.load import bodies
from tracer.engine.body_constants import overridden_constants
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.temperature import Hurley2015
from tracer.engine.scene import Scene
from tracer.engine.sunlight import Sunlight, lines_without_g, replaced_lines
from tracer.physics.host import MoonPlace

DAY = 86400.0

FITTED_BODY = "Moon"
"""Whose observed temperatures `hurley-2015` describes."""


def scene_notes(spec: RunSpec, scene: Scene) -> Iterator[str]:
    """Yield sentences, without a full stop, about what replaces the catalogue, is unknown or is left out."""
    if keys := overridden_constants(spec):
        yield f"body: {', '.join(keys)} from the run file replace the catalogue's values of {spec.body.name}"
    top = scene.body.radius + float(scene.grid.altitude_edges[-1])
    if top > scene.outer_radius * (1.0 + 1e-12):
        yield (
            f"the grid's top, {top / scene.body.radius:.4g} radii from the centre, lies beyond the outer radius, "
            f"{scene.outer_radius / scene.body.radius:.4g} radii: cells out there stay empty, and the cell that the "
            "outer radius cuts shows too little"
        )
    if scene.desorption is not None and spec.surface.sticking == 0.0:
        yield "sticking is 0: nothing is adsorbed, and surface.desorption has no effect"
    if isinstance(spec.surface.temperature, Hurley2015) and spec.body.name != FITTED_BODY:
        yield f"the temperature law hurley-2015 was fitted to the {FITTED_BODY}, not to {spec.body.name}"
    if spec.ensemble.replicates == 0 and any(image.velocity is not None for image in spec.image):
        yield "ensemble.replicates is 0: means and widths of velocities come without errors"
    if scene.sun is not None:
        yield from _sun_notes(spec, scene.sun)
    if scene.moon is not None:
        yield from _host_notes(scene, scene.moon)


def _sun_notes(spec: RunSpec, sun: Sunlight) -> Iterator[str]:
    if missing := lines_without_g(spec):
        yield f"lines {', '.join(missing)} have no known g: they neither push nor shine; a [[gas.line]] can give it"
    if replaced := replaced_lines(spec):
        yield f"lines {', '.join(replaced)} of the run file replace the catalogue's"
    if spec.gas.photoionization_rate is None:
        yield from _photo_notes(spec.gas.species, sun)
    host = bodies()[spec.body.name].host if spec.body.name in bodies() else None
    if host is not None and host.orbit is not None and sun.moon is None:
        if spec.sun is not None and spec.sun.epoch is not None:
            yield (
                f"{spec.body.name} stands at its own distance from the Sun and turns about it with {host.name}; "
                f"the gravity and shadow of {host.name} are left out; body.host brings them in"
            )
        else:
            yield (
                f"{spec.body.name} has the distance and velocity of {host.name} from the Sun; its own motion about "
                f"{host.name}, and the gravity and shadow of {host.name}, are left out; "
                "body.host brings them in"
            )


def _host_notes(scene: Scene, moon: MoonPlace) -> Iterator[str]:
    if scene.sun is None or scene.sun.orbit is None:
        yield (
            "the host keeps its place: the frame turns with the moon about it, "
            f"{np.degrees(abs(moon.rate)) * DAY:.3g} deg a day, and so does the Sun's light; flights that last should "
            'have sun.motion "moving"'
        )
    if moon.host[2] == 0.0:
        yield (
            "the moon's orbit is taken as a circle in the plane of its host's orbit about the Sun: an inclined one may "
            "miss the shadow"
        )
    if scene.sun is not None and scene.sun.shadow != "none":
        yield "the host has no atmosphere that would bend light into its shadow, and shines on nothing itself"


def _photo_notes(species: str, sun: Sunlight) -> Iterator[str]:
    if not sun.photo.total:
        yield (
            f"the catalogue has no photo-rate of {species}: sunlight destroys none; "
            "gas.photoionization_rate can give one"
        )
    elif not sun.photo.told_apart:
        yield f"ionisation and dissociation of {species} are not told apart: all counts as other_loss"
