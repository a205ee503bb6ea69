"""The main job: from a run file to a product."""

import os
from collections.abc import Callable, Generator, Sequence
from functools import partial
from threading import Event
from time import perf_counter

import xarray as xr

from tracer.engine.batches import BatchResult, Task, Work, compile_kernels, make_work, trace_batch
from tracer.engine.executors.threads import map_batches
from tracer.engine.folding import Folder
from tracer.engine.outcome import Costs, make_product
from tracer.engine.progress import Counter, Status, Watcher
from tracer.engine.runspec.run import RunSpec
from tracer.engine.scene import build_scene
from tracer.errors import InputError

MapBatches = Callable[
    [Callable[[Task], BatchResult], Sequence[Task], int, Callable[[], None]],
    Generator[tuple[Task, BatchResult], None, None],
]


def run(
    spec: RunSpec,
    workers: int | None = None,
    watch: Watcher | None = None,
    executor: MapBatches = map_batches,
) -> xr.Dataset:
    """Trace a run file's particles and return the product.

    Parameters
    ----------
    spec : RunSpec
        As `tracer.load_run` gives it.
    workers : int, optional
        Threads; the machine's processors by default. The product is the same to the last bit for any number.
    watch : callable, optional
        Told of the progress now and then; nothing is shown without it.
    executor : callable
        Where batches run, see `tracer.engine.executors`.

    Returns
    -------
    xarray.Dataset
        What `tracer.open_product` gives, in memory.

    Raises
    ------
    InputError
        The run file cannot be resolved.
    TracerError
        The particle budget does not close.
    KeyboardInterrupt
        Ctrl-C; the batches under way are given up within a slice.
    """
    workers = available_processors() if workers is None else workers
    if workers < 1:
        raise InputError(f"workers: {workers} is too few; at least 1")
    scene = build_scene(spec)
    ensemble = spec.ensemble
    work = make_work(scene, ensemble.seed, ensemble.particles_per_batch)
    compile_kernels(work)
    tasks = [Task(r, b) for b in range(ensemble.batches) for r in range(len(scene.releases))]
    replicates = min(ensemble.replicates, ensemble.batches)
    folder = Folder(work.layout, tasks, len(scene.releases), replicates)
    begin = perf_counter()
    _fold_all(work, tasks, workers, folder, watch, executor)
    return make_product(spec, scene, folder, Costs(perf_counter() - begin, workers))


def available_processors() -> int:
    """Return the processors that this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def _fold_all(
    work: Work,
    tasks: Sequence[Task],
    workers: int,
    folder: Folder,
    watch: Watcher | None,
    executor: MapBatches,
) -> None:
    stop = Event()
    counter = Counter()
    trace = partial(trace_batch, work, tell=counter.add, stopped=stop.is_set)

    def tick() -> None:
        if watch is not None:
            watch(_status(work, tasks, workers, folder, counter))

    results = executor(trace, tasks, workers, tick)
    try:
        for task, result in results:
            folder.take(task, result)
            tick()
    finally:
        # Whatever ended the loop, batches under way stop at their next slice.
        stop.set()
        results.close()


def _status(work: Work, tasks: Sequence[Task], workers: int, folder: Folder, counter: Counter) -> Status:
    return Status(
        atoms=counter.atoms,
        atoms_expected=len(tasks) * work.particles,
        flights=counter.flights,
        batches=folder.folded,
        batches_expected=len(tasks),
        relative_error=folder.relative_error(),
        workers=workers,
    )
