"""What every executor offers: one function that runs batches and yields their results as they come.

`map_batches(work, tasks, workers, tell, tick)` starts the tasks in their order and yields (task, result) in the order
in which they finish. `tell` is called, from any thread, with the atoms and flights that were finished; `tick` now and
then from the caller's thread, whose exceptions end the work. When the generator is closed, what is under way is given
up.

`prepare(work)` is called once before the clock starts: workers elsewhere load what batches call.
"""

from collections.abc import Callable, Generator, Iterator, Sequence

from tracer.engine.batches import BatchResult, Task, Work

POLL_SECONDS = 0.1
"""How long a wait may last before Ctrl-C is looked for."""

Tell = Callable[[float, int], None]
Tick = Callable[[], None]
Prepare = Callable[[Work], None]
MapBatches = Callable[
    [Work, Sequence[Task], int, Tell, Tick],
    Generator[tuple[Task, BatchResult], None, None],
]


def nothing_to_prepare(work: Work) -> None:
    """Do nothing: threads find in this process what batches call."""


def window(workers: int, releases: int) -> int:
    """Return how many tasks may be under way or wait to be folded: two a worker, and a batch's further releases."""
    return 2 * workers + releases - 1


class Queue:
    """Which tasks start next: none that is a window or more ahead of the first that is unfinished.

    So results that must wait to be folded, behind one that is late, never fill the memory.
    """

    def __init__(self, tasks: Sequence[Task]) -> None:
        self._tasks = tasks
        self._next = 0
        self._first = 0
        self._finished: set[int] = set()

    def startable(self, size: int) -> Iterator[tuple[int, Task]]:
        """Yield the tasks that may start now, with their places, for a window of `size`; they count as started."""
        while self._next < min(self._first + size, len(self._tasks)):
            self._next += 1
            yield self._next - 1, self._tasks[self._next - 1]

    def finish(self, place: int) -> None:
        """Take note that the task at `place` has its result."""
        self._finished.add(place)
        while self._first in self._finished:
            self._finished.remove(self._first)
            self._first += 1
