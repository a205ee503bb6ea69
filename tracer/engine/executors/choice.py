"""Which executor a run has: threads of this process, or the workers of a cluster."""

from collections.abc import Iterator
from contextlib import contextmanager
from typing import NamedTuple

from tracer.engine.executors import threads
from tracer.engine.executors.dask_cluster import connected
from tracer.engine.executors.seam import MapBatches, Prepare, nothing_to_prepare
from tracer.engine.progress import Note
from tracer.errors import InputError


class Executor(NamedTuple):
    """Where batches run; `workers` is None where the run decides."""

    map_batches: MapBatches
    workers: int | None
    prepare: Prepare


@contextmanager
def chosen_executor(cluster: str | None, workers: int | None, note: Note) -> Iterator[Executor]:
    """Yield the executor that `--cluster` names, threads without it.

    Raises
    ------
    InputError
        Both a cluster and threads are asked for, or the cluster cannot be had.
    """
    if cluster is None:
        yield Executor(threads.map_batches, workers, nothing_to_prepare)
        return
    if workers is not None:
        raise InputError("--workers: is for threads; the workers of a --cluster are its own")
    with connected(cluster, note) as connection:
        yield Executor(connection.map_batches, connection.workers, connection.prepare)
