"""Batches on threads of this process; the kernels run without the interpreter's lock."""

from collections.abc import Callable, Generator, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ThreadPoolExecutor, wait
from itertools import islice

from tracer.engine.batches import BatchResult, Task

POLL_SECONDS = 0.1
"""How long a wait may last before Ctrl-C is looked for."""

WINDOW = 2
"""Tasks under way or waiting to be folded, per worker: bounds the memory."""


def map_batches(
    trace: Callable[[Task], BatchResult], tasks: Sequence[Task], workers: int, tick: Callable[[], None]
) -> Generator[tuple[Task, BatchResult], None, None]:
    """Yield (task, result) for each task, in the order in which they finish; `tick` is called while waiting.

    Tasks start in their order; a new one starts when a result was taken. Whoever stops early, or is interrupted, tells
    `trace` to give up: tasks under way are left to end by themselves.
    """
    waiting = iter(tasks)
    pool = ThreadPoolExecutor(workers, thread_name_prefix="tracer")
    running: dict[Future[BatchResult], Task] = {}

    def start(count: int) -> None:
        for task in islice(waiting, count):
            running[pool.submit(trace, task)] = task

    try:
        start(WINDOW * workers)
        while running:
            done, _ = wait(running, timeout=POLL_SECONDS, return_when=FIRST_COMPLETED)
            tick()
            for future in done:
                task = running.pop(future)
                yield task, future.result()
                start(1)
    finally:
        # Waiting here would wait for whole batches: only the caller can tell them to stop.
        pool.shutdown(wait=False, cancel_futures=True)
