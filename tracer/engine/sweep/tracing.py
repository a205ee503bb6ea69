"""The job of a sweep: its points one after the other, then all of them in one product."""

import os
from collections.abc import Sequence
from contextlib import suppress
from pathlib import Path
from typing import Any, NamedTuple

from tracer.engine.executors.seam import MapBatches, Prepare, nothing_to_prepare
from tracer.engine.executors.threads import map_batches
from tracer.engine.memory import GIGABYTE, available_memory
from tracer.engine.progress import Note, Status, Watcher, no_note
from tracer.engine.sweep.points import Sweep, about_point
from tracer.engine.sweep.preparing import PreparedPoint, PreparedSweep, notes_of, prepare_sweep
from tracer.engine.sweep.store import PointStore
from tracer.engine.tracing import available_processors, run
from tracer.errors import InputError, TracerError
from tracer.product.lock import output_lock
from tracer.product.provenance import global_attributes
from tracer.product.reading import open_sweep
from tracer.product.replacing import remove_leftovers
from tracer.product.sweep_layout import KIND, SWEEP, SWEEP_HASH
from tracer.product.sweeping import PointHead, read_head, swept_product
from tracer.product.writing import check_output, save_product, save_sweep

SUMMED = ("flights", "integration_steps", "kernel_seconds", "wall_seconds")


class Kept(NamedTuple):
    """What is safe on the disk when a sweep ends early: whole points, and batches of the one under way."""

    points: int
    number: int
    batches: int


class SweepStopped(TracerError):
    """A sweep has failed at one of its points; what is `kept` need not be traced again."""

    def __init__(self, message: str, kept: Kept, exit_code: int) -> None:
        super().__init__(message)
        self.kept = kept
        self.exit_code = exit_code


class SweepInterrupted(KeyboardInterrupt):
    """Ctrl-C during a sweep; what is `kept` need not be traced again."""

    def __init__(self, kept: Kept) -> None:
        super().__init__()
        self.kept = kept


def run_sweep(
    sweep: Sweep,
    output: str | os.PathLike[str],
    workers: int | None = None,
    watch: Watcher | None = None,
    executor: MapBatches = map_batches,
    *,
    prepare: Prepare = nothing_to_prepare,
    overwrite: bool = False,
    resume: bool = False,
    note: Note = no_note,
) -> bool:
    """Trace all points of a sweep and write them as one product.

    Each point that is finished is kept at once in a hidden folder beside the output, each that is under way in
    checkpoints; the folder goes when the product stands. Memory is that of one point.

    Parameters
    ----------
    sweep : Sweep
        As `tracer.load_sweep` gives it.
    output : path
        The product.
    workers : int, optional
        Threads, or whatever else the executor has; the machine's processors by default.
    watch : callable, optional
        Told of the progress of the whole sweep now and then.
    executor : callable
        Where batches run, see `tracer.engine.executors`.
    prepare : callable, optional
        Has the executor's workers load what batches call, before a point's clock starts.
    overwrite : bool
        Whether an existing product is replaced, and what an interrupted sweep has left is dropped.
    resume : bool
        Whether to go on from what an interrupted sweep has left. Points are known by what they are: values may have
        been added to the sweep meanwhile.
    note : callable, optional
        Told of what happens.

    Returns
    -------
    bool
        False where the output is the product of this very sweep already, and nothing was done.

    Raises
    ------
    InputError
        A point cannot be traced or kept beside the others, or needs more memory than there is; or the output exists.
    TracerError
        Tracing or writing failed; `SweepStopped` where points are kept.
    KeyboardInterrupt
        Ctrl-C, as `SweepInterrupted`.
    """
    workers = available_processors() if workers is None else workers
    if workers < 1:
        raise InputError(f"workers: {workers} is too few; at least 1")
    if not (resume and Path(output).exists()):
        check_output(output, overwrite)
    prepared = prepare_sweep(sweep, workers)
    _refuse_what_does_not_fit(prepared)
    for text in notes_of(prepared):
        note("note", f"Note: {text}.")
    with output_lock(output):
        store = PointStore(output)
        if resume and Path(output).exists() and _is_done(prepared, output, overwrite):
            store.remove()
            return False
        _check_store(store, output, overwrite, resume)
        remove_leftovers(Path(os.path.realpath(output)))
        store.make()
        _trace_all(_Job(prepared, store, workers, watch, executor, prepare, note))
        _put_together(prepared, store, output, overwrite)
        store.remove()
    return True


class _Job(NamedTuple):
    prepared: PreparedSweep
    store: PointStore
    workers: int
    watch: Watcher | None
    executor: MapBatches
    prepare: Prepare
    note: Note


def _refuse_what_does_not_fit(prepared: PreparedSweep) -> None:
    there = available_memory()
    if there is not None and prepared.memory > there:
        raise InputError(
            f"{prepared.sweep.file}: a point needs about {prepared.memory / GIGABYTE:.3g} GB of memory, "
            f"{there / GIGABYTE:.3g} GB is available; ask for fewer cells, pixels, replicates or workers"
        )


def _is_done(prepared: PreparedSweep, output: str | os.PathLike[str], overwrite: bool) -> bool:
    # What cannot be read as a sweep is not this one: whether it may be replaced is asked below.
    with suppress(InputError), open_sweep(output) as ds:
        if ds.attrs.get(SWEEP_HASH) == prepared.sweep_hash:
            return True
    check_output(output, overwrite)
    return False


def _check_store(store: PointStore, output: str | os.PathLike[str], overwrite: bool, resume: bool) -> None:
    """See to it that a fresh start destroys no work unasked."""
    if resume or not store.exists():
        return
    if not overwrite:
        raise InputError(
            f"{os.fspath(output)}: an interrupted sweep has left finished points or checkpoints; --resume goes on from "
            "them, --overwrite starts afresh"
        )
    store.remove()


def _trace_all(job: _Job) -> None:
    points = job.prepared.points
    waiting = [one for one in points if not job.store.finished(one.identity, job.note)]
    if kept := len(points) - len(waiting):
        job.note("resumed", f"{kept} of {len(points)} points are finished already", points=kept)
    # Points that are the same run, as where only the title varies, are traced once.
    waiting = list({one.identity: one for one in waiting}.values())
    watch = None if job.watch is None else _OverallWatch(job.watch, waiting, len(points))
    for done, one in enumerate(waiting):
        if watch is not None:
            watch.begin(one)
        finished = len(points) - len(waiting) + done
        try:
            _trace_point(job, one, finished, watch)
        except SweepInterrupted:
            raise
        except KeyboardInterrupt:
            raise SweepInterrupted(Kept(finished, one.point.number, 0)) from None


def _trace_point(job: _Job, one: PreparedPoint, finished: int, watch: Watcher | None) -> None:
    """Trace one point and keep its product."""
    point = one.point
    checkpoints = job.store.checkpoints(one.identity, job.note)
    text = f"point {point.number} of {len(job.prepared.points)}: {point.words}"
    job.note("point", text, number=point.number, values=point.words)

    def kept() -> Kept:
        whole = job.store.path(one.identity).exists()
        return Kept(finished + whole, point.number, 0 if whole else checkpoints.kept_batches)

    try:
        product = run(
            point.spec,
            job.workers,
            watch,
            job.executor,
            prepare=job.prepare,
            checkpoints=checkpoints,
            note=job.note,
        )
        save_product(product, job.store.path(one.identity), overwrite=True)
    except KeyboardInterrupt:
        raise SweepInterrupted(kept()) from None
    except TracerError as error:
        if checkpoints.begun:
            checkpoints.write()
        told = about_point(job.prepared.sweep, point.number, point.words, InputError(str(error)))
        raise SweepStopped(str(told), kept(), error.exit_code) from None
    checkpoints.remove()
    job.note("point finished", "", number=point.number, data_checksum=product.attrs["data_checksum"])


def _put_together(
    prepared: PreparedSweep, store: PointStore, output: str | os.PathLike[str], overwrite: bool
) -> None:
    kept = Kept(len(prepared.points), 0, 0)
    try:
        known = {one.identity: read_head(store.path(one.identity)) for one in prepared.points}
        heads = [known[one.identity] for one in prepared.points]
        # Each product counts once, however many points it stands for.
        attributes = _attributes(prepared, list(known.values()))
        with swept_product(heads, prepared.axes, attributes) as ds:
            save_sweep(ds, output, overwrite)
    except KeyboardInterrupt:
        raise SweepInterrupted(kept) from None
    except TracerError as error:
        raise SweepStopped(str(error), kept, error.exit_code) from None


def _attributes(prepared: PreparedSweep, products: Sequence[PointHead]) -> dict[str, Any]:
    sweep = prepared.sweep
    each = [one.attributes for one in products]
    references = [text for one in each for text in str(one["references"]).split("; ")]
    return {
        **global_attributes(
            sweep.title, f"swept from {Path(sweep.file).name}", list(dict.fromkeys(references))
        ),
        KIND: SWEEP,
        "sweep_file": sweep.text,
        SWEEP_HASH: prepared.sweep_hash,
        "points": len(sweep),
        **{name: sum(one[name] for one in each) for name in SUMMED},
        "workers": max(int(one["workers"]) for one in each),
        "body_radius": prepared.body_radius,
        "complete": 1,
    }


class _OverallWatch:
    """Tells of the whole sweep where a run tells of its point: what is left to do and what is done."""

    def __init__(self, watch: Watcher, waiting: Sequence[PreparedPoint], points: int) -> None:
        self._watch = watch
        self._expected = sum(one.atoms for one in waiting)
        self._points = points
        self._before = (0.0, 0)
        self._now: tuple[PreparedPoint, int] | None = None

    def begin(self, one: PreparedPoint) -> None:
        """Go on to the next point."""
        if self._now is not None:
            before, flights = self._now
            self._before = (self._before[0] + before.atoms, self._before[1] + flights)
        self._now = (one, 0)

    def __call__(self, status: Status) -> None:
        """Pass on the status of a point as that of the sweep."""
        assert self._now is not None
        one, _ = self._now
        self._now = (one, status.flights)
        atoms, flights = self._before
        # A rule may end a point early: then its atoms count as followed all the same.
        share = status.atoms / status.atoms_expected if status.atoms_expected else 1.0
        self._watch(
            status._replace(
                atoms=atoms + one.atoms * share,
                atoms_expected=self._expected,
                flights=flights + status.flights,
                part=f"point {one.point.number} of {self._points}",
            )
        )
