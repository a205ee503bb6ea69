"""Two checkpoints beside the output, written in turn: whatever happens to one, the other is whole."""

import os
from pathlib import Path
from time import perf_counter
from typing import NamedTuple

import numpy as np

from tracer.engine.checkpoint import (
    DamagedCheckpoint,
    Header,
    Identity,
    Progress,
    check_numbers,
    read_header,
    read_numbers,
    why_not_ours,
    write_checkpoint,
)
from tracer.engine.folding import Folder
from tracer.engine.progress import Note, no_note
from tracer.errors import InputError
from tracer.product.replacing import remove_leftovers

LETTERS = ("a", "b")
SHORTEST_INTERVAL = 5.0
"""Seconds between checkpoints, where writing them is cheap."""
LONGEST_INTERVAL = 60.0
"""Seconds of folded work that may be lost at the most."""
COST_SHARE = 0.02
"""Share of the time that writing may take."""


class Begun(NamedTuple):
    """A run under way, as its checkpoints see it."""

    identity: Identity
    folder: Folder
    start: float


class Checkpoints:
    """The checkpoints of the run that makes one output.

    Attributes
    ----------
    output : Path or None
        The product beside which they lie; None for a run that keeps none.
    resume : bool
        Whether the run goes on from what is there.
    kept : int
        Tasks whose sums are safe on the disk.
    """

    def __init__(
        self, output: str | os.PathLike[str] | None, resume: bool = False, note: Note = no_note
    ) -> None:
        self.output = None if output is None else Path(os.path.realpath(output))
        self.resume = resume
        self.kept = 0
        self._note = note
        self._serial = 0
        self._wall_before = 0.0
        self._begun: Begun | None = None
        self._written = 0.0
        self._cost = 0.0

    @property
    def _name(self) -> str:
        return "" if self.output is None else self.output.name

    @property
    def begun(self) -> bool:
        """Whether a run has taken these checkpoints over."""
        return self._begun is not None

    @property
    def kept_batches(self) -> int:
        """Whole batches whose sums are safe on the disk."""
        return 0 if self._begun is None else self.kept // len(self._begun.folder.statistics)

    def slots(self) -> list[Path]:
        """Return the two files' names, whether they exist or not."""
        if self.output is None:
            return []
        return [self.output.with_name(f".{self.output.name}.checkpoint-{letter}") for letter in LETTERS]

    def existing(self) -> list[Path]:
        """Return the files that are there."""
        return [path for path in self.slots() if os.path.lexists(path)]

    def remove(self) -> None:
        """Remove both files, the product being written or a fresh start being asked for."""
        for path in self.existing():
            path.unlink(missing_ok=True)

    def remove_leftovers(self) -> None:
        """Remove what a killed run has half written, of the checkpoints and of the product."""
        for path in [*self.slots(), *([] if self.output is None else [self.output])]:
            remove_leftovers(path)

    def begin(self, identity: Identity, folder: Folder) -> None:
        """Take over the run, and fill `folder` from the newest whole checkpoint if it is to be resumed.

        Raises
        ------
        InputError
            The checkpoint belongs to another run, version or platform, or all that is there is damaged.
        """
        self._begun = Begun(identity, folder, perf_counter())
        self._written = perf_counter()
        if self.resume:
            self._go_on(identity, folder)

    def wall_seconds(self) -> float:
        """Return the time spent on tracing, over all sessions."""
        return 0.0 if self._begun is None else self._wall_before + perf_counter() - self._begun.start

    def after_fold(self) -> None:
        """Write a checkpoint where one is due."""
        interval = min(max(SHORTEST_INTERVAL, self._cost / COST_SHARE), LONGEST_INTERVAL)
        if perf_counter() - self._written >= interval:
            self.write()

    def write(self) -> bool:
        """Write a checkpoint of all that is folded and return whether it is safe now; a failure is noted only."""
        if self.output is None or self._begun is None or self._begun.folder.folded == self.kept:
            return True
        identity, folder, _ = self._begun
        begin = perf_counter()
        self._serial += 1
        progress = Progress(
            serial=self._serial,
            folded=folder.folded,
            region=len(folder.region),
            flights=folder.flights,
            steps=folder.steps,
            kernel_seconds=folder.kernel_seconds,
            wall_seconds=self.wall_seconds(),
        )
        path = self.slots()[self._serial % len(LETTERS)]
        try:
            write_checkpoint(path, identity, progress, [*folder.arrays(), np.array(folder.region)])
        except OSError as error:
            self._note("checkpoint failed", f"no checkpoint could be written: {error.strerror}")
            return False
        finally:
            self._written = perf_counter()
            self._cost = self._written - begin
        self.kept = folder.folded
        self._note("checkpoint", "", batches=folder.batches, seconds=self._cost)
        return True

    def _go_on(self, identity: Identity, folder: Folder) -> None:
        found: dict[Path, Header] = {}
        damaged: dict[Path, str] = {}
        for path in self.existing():
            try:
                found[path] = read_header(path)
            except (DamagedCheckpoint, OSError) as error:
                damaged[path] = _reason(error)
        for path, header in sorted(found.items(), key=lambda item: -item[1].progress.serial):
            try:
                self._take(path, header, identity, folder)
            except (DamagedCheckpoint, OSError) as error:
                damaged[path] = _reason(error)
            else:
                self._say_where(folder, damaged)
                return
        if damaged:
            reasons = "; ".join(f"{path.name} {reason}" for path, reason in damaged.items())
            raise InputError(f"{self._name}: {reasons}. {START_AFRESH}")
        self._note("no checkpoint", f"there is no checkpoint of {self._name}: starting afresh")

    def _take(self, path: Path, header: Header, identity: Identity, folder: Folder) -> None:
        if reason := why_not_ours(header.identity, identity):
            raise InputError(f"{self._name}: its checkpoint {reason}. {START_AFRESH}")
        progress = header.progress
        if progress.folded > folder.tasks:
            batches = progress.folded // len(folder.statistics)
            raise InputError(
                f"{self._name}: its checkpoint holds {batches} batches, more than the run asks for. "
                f"{START_AFRESH}"
            )
        region_expected = progress.folded if identity.stop else 0
        if progress.region != region_expected:
            raise DamagedCheckpoint("its header is damaged")
        arrays = folder.arrays()
        check_numbers(path, header, sum(array.size for array in arrays) + region_expected)
        region = np.empty(region_expected)
        read_numbers(path, header, [*arrays, region])
        folder.flights, folder.steps = progress.flights, progress.steps
        folder.kernel_seconds = progress.kernel_seconds
        folder.go_on_from(progress.folded, region.tolist())
        self._serial, self._wall_before = progress.serial, progress.wall_seconds
        self.kept = progress.folded

    def _say_where(self, folder: Folder, damaged: dict[Path, str]) -> None:
        lost = "".join(f"{path.name} {reason}; " for path, reason in damaged.items())
        text = f"{lost}going on from the checkpoint at batch {folder.batches}"
        self._note("resumed", text, batches=folder.batches)


START_AFRESH = "Without --resume, --overwrite starts afresh"


def _reason(error: DamagedCheckpoint | OSError) -> str:
    return (error.strerror or "cannot be read") if isinstance(error, OSError) else str(error)
