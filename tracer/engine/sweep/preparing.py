"""All points of a sweep checked before the first is traced: each by itself, and all against each other."""

import hashlib
from collections.abc import Iterator
from typing import Any, NamedTuple

import numpy as np

from tracer.engine.memory import Sizes, sizes
from tracer.engine.notes import scene_notes
from tracer.engine.planning import Plan, make_plan
from tracer.engine.runspec.load import SWEEP
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.writing import run_file_text
from tracer.engine.scene import Scene, build_scene
from tracer.engine.stopping import FIRST_DECISION
from tracer.engine.sweep.coordinates import swept_axes
from tracer.engine.sweep.points import Point, Sweep, about_point, sweep_points
from tracer.errors import InputError
from tracer.product.layout import variable_names
from tracer.product.sweep_layout import SweptAxis

HASH_LETTERS = 20


class PreparedPoint(NamedTuple):
    """A point that can be traced.

    `identity` tells its run from every other, whatever its title; `atoms` is how many it follows, at the most;
    `sizes` are what it needs; `notes` are sentences about its scene.
    """

    point: Point
    identity: str
    atoms: int
    sizes: Sizes
    notes: tuple[str, ...]


class PreparedSweep(NamedTuple):
    """A sweep whose points all can be traced and fit into one product."""

    sweep: Sweep
    points: tuple[PreparedPoint, ...]
    axes: tuple[SweptAxis, ...]
    body_radius: float

    @property
    def sweep_hash(self) -> str:
        """Hash of what is swept and of every point's run."""
        named = [f"{axis.name} {axis.dimension} {axis.values.tolist()}" for axis in self.axes]
        text = "\n".join([*named, *(one.identity for one in self.points)])
        return hashlib.sha256(text.encode()).hexdigest()

    @property
    def memory(self) -> int:
        """Memory [bytes] that its most demanding point needs; putting them together takes less."""
        return max(one.sizes.memory for one in self.points)

    @property
    def product_size(self) -> int:
        """Size [bytes] of the product, at the most; as much again is needed while points are put together."""
        return sum(one.sizes.product for one in self.points)


class Shape(NamedTuple):
    """What all points of a sweep must share, since their product has it once."""

    grid: Any
    images: Any
    releases: Any
    lines: Any
    surface_temperature: Any
    adsorbed_column: Any
    host: Any
    replicates: Any
    launch_speeds: Any


def prepare_sweep(sweep: Sweep, workers: int) -> PreparedSweep:
    """Check all points of a sweep, without tracing any.

    Parameters
    ----------
    sweep : Sweep
        As `load_sweep` gives it.
    workers : int
        Threads, or whatever else traces side by side.

    Raises
    ------
    InputError
        A point that cannot be resolved, or whose product has another shape than the first point's.
    """
    points: list[Point] = []
    prepared: list[PreparedPoint] = []
    radii: list[float] = []
    first: Shape | None = None
    for point in sweep_points(sweep):
        try:
            plan = make_plan(point.spec, build_scene(point.spec))
        except InputError as error:
            raise about_point(sweep, point.number, point.words, error) from None
        _refuse_uncertain_replicates(sweep, plan)
        shape = _shape(plan)
        if first is None:
            first = shape
            _refuse_names_of_images(sweep, plan.scene)
        else:
            _refuse_other_shape(sweep, point, first, shape)
        atoms = plan.batches.batches * plan.work.particles * len(plan.scene.releases)
        notes = tuple(scene_notes(point.spec, plan.scene))
        points.append(point)
        prepared.append(PreparedPoint(point, _identity(plan), atoms, sizes(plan, workers), notes))
        radii.append(plan.scene.body.radius)
    return PreparedSweep(sweep, tuple(prepared), swept_axes(sweep, points, radii), radii[0])


def notes_of(prepared: PreparedSweep) -> Iterator[str]:
    """Yield what a user should know about the points' scenes, each sentence once."""
    numbers: dict[str, list[int]] = {}
    for one in prepared.points:
        for text in one.notes:
            numbers.setdefault(text, []).append(one.point.number)
    for text, at in numbers.items():
        few = ", ".join(map(str, at[:5])) + (", ..." if len(at) > 5 else "")
        yield text if len(at) == len(prepared.points) else f"point {few}: {text}"


def _identity(plan: Plan) -> str:
    """Return what tells a point's product from others': all of its run file but the title, and its scene."""
    untitled = run_file_text(RunSpec.model_copy(plan.spec, update={"title": "-"}))
    return hashlib.sha256(f"{plan.run_hash}\n{untitled}".encode()).hexdigest()[:HASH_LETTERS]


def _shape(plan: Plan) -> Shape:
    scene = plan.scene
    return Shape(
        grid=scene.grid,
        images=scene.planes,
        releases=tuple(release.name for release in scene.releases),
        lines=tuple(line.name for line in scene.lines),
        surface_temperature=scene.surface_temperature is not None,
        adsorbed_column=scene.desorption is not None,
        host=scene.moon is not None,
        replicates=plan.replicates,
        launch_speeds=() if plan.work.responses is None else tuple(plan.work.responses.edges.tolist()),
    )


_WORDS = {
    "grid": "another grid or body radius",
    "images": "other images",
    "releases": "other releases",
    "lines": "other emission lines",
    "surface_temperature": "a surface temperature where others have none, or none where others have one",
    "adsorbed_column": 'another word for surface.adsorbed, which decides over the variable "adsorbed_column"',
    "host": "a host where others have none, or none where others have one",
    "replicates": "another number of replicates",
    "launch_speeds": "other bins of launch speed",
}
_RADII_HINT = "Lengths in radii follow the body's radius: give them in km, or make several sweeps"
_HINTS = {
    "grid": _RADII_HINT,
    "images": _RADII_HINT,
    "launch_speeds": "The bins of ensemble.speed_bins follow the run's laws and the escape speed: evaluate other laws "
    "from the responses of one run, or set speed_bins = 0",
}
"""What to do instead, where it is not plain."""


def _refuse_uncertain_replicates(sweep: Sweep, plan: Plan) -> None:
    """Refuse more replicates than a point is sure to have, where a rule may end it at its first decision."""
    if plan.rule is not None and plan.replicates > FIRST_DECISION:
        raise InputError(
            f"{sweep.file}: ensemble.replicates: {plan.spec.ensemble.replicates} is out of range beside ensemble.stop, "
            f"which may end a point after {FIRST_DECISION} batches; must be at most {FIRST_DECISION} in a sweep"
        )


def _refuse_other_shape(sweep: Sweep, point: Point, first: Shape, shape: Shape) -> None:
    for name, ours, theirs in zip(Shape._fields, first, shape, strict=True):
        if not _same(ours, theirs):
            raise InputError(
                f"{sweep.file}: {SWEEP}: point {point.number} ({point.words}) has {_WORDS[name]} than point 1; the "
                f"points of one product share them. {_HINTS.get(name, 'Make several sweeps')}"
            )


def _same(one: Any, other: Any) -> bool:
    if isinstance(one, np.ndarray):
        return one.shape == other.shape and np.array_equal(one, other)
    if isinstance(one, tuple):
        return len(one) == len(other) and all(map(_same, one, other))
    return bool(one == other)


def _refuse_names_of_images(sweep: Sweep, scene: Scene) -> None:
    """Refuse axes with the names of an image's variables or dimensions."""
    taken = set(variable_names([plane.name for plane in scene.planes]))
    for number, axis in enumerate(sweep.axes, 1):
        if {axis.name, f"{axis.name}_name"} & taken:
            raise InputError(
                f'{sweep.file}: {SWEEP}.axis[{number}].name: "{axis.name}" is taken by an image; rename one of them'
            )
