"""Take results in whatever order they come and fold them in the order of the batches."""

from collections.abc import Sequence

import numpy as np

from tracer.engine.batches import BatchResult, Task
from tracer.tally.buffer import BufferLayout
from tracer.tally.statistics import BatchStatistics


class Folder:
    """Batch statistics of every release, and the costs so far.

    Attributes
    ----------
    statistics : list of BatchStatistics
        One a release.
    flights : int
        Launches of the folded batches.
    kernel_seconds : float
        Processor time [s] of the folded batches.
    """

    def __init__(self, layout: BufferLayout, tasks: Sequence[Task], releases: int, replicates: int) -> None:
        self.statistics = [BatchStatistics(layout, replicates) for _ in range(releases)]
        self.flights = 0
        self.kernel_seconds = 0.0
        self.folded = 0
        self._tasks = tasks
        self._waiting: dict[Task, BatchResult] = {}

    def take(self, task: Task, result: BatchResult) -> None:
        """Keep `result` until all tasks before it have come, then fold it: float sums depend on the order."""
        self._waiting[task] = result
        while self.folded < len(self._tasks) and (due := self._tasks[self.folded]) in self._waiting:
            ready = self._waiting.pop(due)
            self.statistics[due.release].fold(ready.buffer)
            self.flights += ready.flights
            self.kernel_seconds += ready.kernel_seconds
            self.folded += 1

    def relative_error(self) -> float | None:
        """Return the relative error of the releases' whole mean life, None before two batches."""
        # The life stands last in a buffer: the one number that stands for all content.
        means = np.array([one.mean[-1] for one in self.statistics])
        batches = min(one.batches for one in self.statistics)
        if batches < 2 or not means.sum() > 0.0:
            return None
        variance = sum(
            one.squared_deviation[-1] / (one.batches * (one.batches - 1)) for one in self.statistics
        )
        return float(np.sqrt(variance) / means.sum())
