"""Batches on threads of this process; the kernels run without the interpreter's lock."""

from collections.abc import Generator, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ThreadPoolExecutor, wait
from threading import Event

from tracer.engine.batches import BatchResult, Task, Work, trace_batch
from tracer.engine.executors.seam import POLL_SECONDS, Queue, Tell, Tick, window


def map_batches(
    work: Work, tasks: Sequence[Task], workers: int, tell: Tell, tick: Tick
) -> Generator[tuple[Task, BatchResult], None, None]:
    """Yield (task, result) for each task, in the order in which they finish; see `tracer.engine.executors.seam`."""
    queue = Queue(tasks)
    size = window(workers, len(work.scene.releases))
    stop = Event()
    pool = ThreadPoolExecutor(workers, thread_name_prefix="tracer")
    running: dict[Future[BatchResult], tuple[int, Task]] = {}

    def start() -> None:
        for place, task in queue.startable(size):
            running[pool.submit(trace_batch, work, task, tell, stop.is_set)] = place, task

    try:
        start()
        while running:
            done, _ = wait(running, timeout=POLL_SECONDS, return_when=FIRST_COMPLETED)
            tick()
            # In their order: the fewer must wait to be folded, and what is folded grows batch by batch.
            for future in sorted(done, key=lambda future: running[future][0]):
                place, task = running.pop(future)
                yield task, future.result()
                queue.finish(place)
                start()
    finally:
        # Tasks under way end by themselves at their next slice: nothing waits for them here.
        stop.set()
        pool.shutdown(wait=False, cancel_futures=True)
