"""What a run is to do, before anything is done."""

from collections.abc import Mapping
from typing import Any, NamedTuple

from tracer.engine.batches import Work, make_work
from tracer.engine.checkpoint import Identity
from tracer.engine.fingerprint import fingerprint
from tracer.engine.folding import Folder
from tracer.engine.hashing import run_hash, scene_hash
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.writing import run_file_text
from tracer.engine.scene import Scene, referenced_files
from tracer.engine.stopping import StopRule, make_stop_rule
from tracer.engine.tasks import BatchRange, Tasks
from tracer.errors import InputError
from tracer.product.batch_ranges import ranges_text


class Plan(NamedTuple):
    """A run file resolved, with the batches to trace and the rule by which they end."""

    spec: RunSpec
    scene: Scene
    work: Work
    batches: BatchRange
    rule: StopRule | None
    scene_hash: str

    @property
    def tasks(self) -> Tasks:
        """All tasks, in the order in which they are folded."""
        return Tasks(self.batches, len(self.scene.releases))

    @property
    def replicates(self) -> int:
        """Groups of batches that are kept; a run that may stop early has at least this many batches or one each."""
        return min(self.spec.ensemble.replicates, self.batches.batches)

    @property
    def run_hash(self) -> str:
        """Hash of scene, seed and particles per batch."""
        ensemble = self.spec.ensemble
        return run_hash(self.scene_hash, ensemble.seed, ensemble.particles_per_batch)

    @property
    def known(self) -> str:
        """Whose relative error tells how far the run has come, in words."""
        stop = self.spec.ensemble.stop
        return "mean life" if stop is None else f"{stop.variable} of the region"

    def is_told_by(self, attributes: Mapping[str, Any]) -> bool:
        """Whether a product with these attributes is what the run would make."""
        seed, batches = self.spec.ensemble.seed, self.batches
        if self.spec.ensemble.stop is not None:
            # Where the rule ended the run is the product's own word; the rule itself stands in its run file.
            if "stop_reached" not in attributes or run_file_text(self.spec) != attributes.get("run_file"):
                return False
            batches = BatchRange(0, int(attributes["batches"]))
        ranges = ranges_text([(seed, *batches)])
        return attributes.get("run_hash") == self.run_hash and attributes.get("batch_ranges") == ranges

    def identity(self) -> Identity:
        """Return what a checkpoint of this run is known by."""
        stop = self.spec.ensemble.stop
        words = "" if stop is None else stop.model_dump_json(exclude_none=True)
        return Identity(self.run_hash, self.batches.first, self.replicates, words, fingerprint())

    def new_folder(self) -> Folder:
        """Return a folder into which nothing has been folded."""
        return Folder(self.work.layout, self.tasks, len(self.scene.releases), self.replicates, self.rule)


def make_plan(spec: RunSpec, scene: Scene, batches: BatchRange | None = None) -> Plan:
    """Plan a resolved run file, for all its batches or for a share of them.

    Raises
    ------
    InputError
        A stop rule that does not fit the scene, or a share is asked for of a run whose end its results decide.
    """
    ensemble = spec.ensemble
    if batches is not None and ensemble.stop is not None:
        raise InputError(
            f"{spec.file}: ensemble.stop: decides over the whole run, which no share can know; "
            "leave out either it or --batches"
        )
    work = make_work(scene, ensemble.seed, ensemble.particles_per_batch)
    return Plan(
        spec,
        scene,
        work,
        batches or BatchRange(0, ensemble.most_batches),
        make_stop_rule(spec, scene, work.layout),
        scene_hash(scene, referenced_files(spec)),
    )
