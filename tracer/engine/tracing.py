"""The main job: from a run file to a product."""

import os
from collections.abc import Generator

import xarray as xr

from tracer.engine.batches import BatchResult, Task, compile_kernels
from tracer.engine.checkpoint_slots import Checkpoints
from tracer.engine.emphasis import with_emphasis
from tracer.engine.executors.seam import MapBatches, Prepare, Tick, nothing_to_prepare
from tracer.engine.executors.threads import map_batches
from tracer.engine.folding import Folder
from tracer.engine.interruption import deferred_interrupts
from tracer.engine.memory import refuse_what_does_not_fit
from tracer.engine.outcome import Costs, make_product
from tracer.engine.planning import Plan, make_plan
from tracer.engine.progress import Counter, Note, Status, Watcher, no_note
from tracer.engine.runspec.run import RunSpec
from tracer.engine.scene import build_scene
from tracer.engine.tasks import BatchRange
from tracer.errors import InputError
from tracer.tally.statistics import compile_folding


def run(
    spec: RunSpec,
    workers: int | None = None,
    watch: Watcher | None = None,
    executor: MapBatches = map_batches,
    *,
    prepare: Prepare = nothing_to_prepare,
    batches: BatchRange | None = None,
    checkpoints: Checkpoints | None = None,
    note: Note = no_note,
) -> xr.Dataset:
    """Trace a run file's particles and return the product.

    Parameters
    ----------
    spec : RunSpec
        As `tracer.load_run` gives it.
    workers : int, optional
        Threads, or whatever else the executor has; the machine's processors by default. The product is the same to the
        last bit for any number.
    watch : callable, optional
        Told of the progress now and then; nothing is shown without it.
    executor : callable
        Where batches run, see `tracer.engine.executors`.
    prepare : callable, optional
        Has the executor's workers load what batches call, before the clock starts.
    batches : BatchRange, optional
        A share of the run: these batches alone. `tracer merge` puts shares together.
    checkpoints : Checkpoints, optional
        Where the sums so far are kept, and whether to go on from them. Nothing is kept without it.
    note : callable, optional
        Told of what happens: checkpoints, lost workers, the decision of a stop rule.

    Returns
    -------
    xarray.Dataset
        What `tracer.open_product` gives, in memory.

    Raises
    ------
    InputError
        The run file cannot be resolved, needs more memory than there is, or the checkpoint belongs to another run.
    TracerError
        The particle budget does not close, or the workers are lost.
    KeyboardInterrupt
        Ctrl-C; the batches under way are given up within a slice, a checkpoint is written.
    """
    workers = available_processors() if workers is None else workers
    if workers < 1:
        raise InputError(f"workers: {workers} is too few; at least 1")
    plan = make_plan(spec, build_scene(spec), batches)
    refuse_what_does_not_fit(plan, workers)
    plan = plan._replace(work=with_emphasis(plan.work))
    compile_kernels(plan.work)
    compile_folding()
    prepare(plan.work)
    folder = plan.new_folder()
    checkpoints = Checkpoints(None) if checkpoints is None else checkpoints
    checkpoints.begin(plan.identity(), folder)
    note("tracing", "", batches=folder.batches, batches_expected=plan.batches.batches, workers=workers)
    _fold_all(plan, folder, workers, watch, executor, checkpoints)
    wall_seconds = checkpoints.wall_seconds()
    note("traced", "", batches=folder.batches, flights=folder.flights, wall_seconds=wall_seconds)
    return make_product(plan, folder, Costs(wall_seconds, workers))


def available_processors() -> int:
    """Return the processors that this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def _fold_all(
    plan: Plan,
    folder: Folder,
    workers: int,
    watch: Watcher | None,
    executor: MapBatches,
    checkpoints: Checkpoints,
) -> None:
    counter = Counter(folder.folded * plan.work.launches, folder.flights)
    with deferred_interrupts() as interrupted:

        def tick() -> None:
            if watch is not None:
                watch(_status(plan, folder, workers, counter))
            if interrupted():
                raise KeyboardInterrupt

        if folder.done:
            return
        results = executor(plan.work, plan.tasks.behind(folder.folded), workers, counter.add, tick)
        try:
            while not folder.done and (arrived := _arrived(results, tick, checkpoints)) is not None:
                folder.take(*arrived)
                checkpoints.after_fold()
            if watch is not None:
                watch(_status(plan, folder, workers, counter))
        finally:
            # Whatever ended the loop, batches under way stop at their next slice.
            results.close()


def _arrived(
    results: Generator[tuple[Task, BatchResult], None, None], tick: Tick, checkpoints: Checkpoints
) -> tuple[Task, BatchResult] | None:
    """Return what comes next, None at the end; whatever goes wrong meanwhile, the sums so far are whole and kept."""
    try:
        tick()
        return next(results, None)
    except BaseException:
        checkpoints.write()
        raise


def _status(plan: Plan, folder: Folder, workers: int, counter: Counter) -> Status:
    return Status(
        # Parts of atoms add up to rounding.
        atoms=round(counter.atoms, 6),
        atoms_expected=folder.tasks * plan.work.launches,
        flights=counter.flights,
        batches=folder.batches,
        batches_expected=plan.batches.batches,
        relative_error=folder.relative_error(),
        known=plan.known,
        workers=workers,
    )
