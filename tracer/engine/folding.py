"""Take results in whatever order they come and fold them in the order of the batches."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from tracer.engine.batches import BatchResult, Task
from tracer.engine.stopping import StopRule
from tracer.tally.buffer import BufferLayout, tally_views
from tracer.tally.statistics import BatchStatistics


class Folder:
    """Batch statistics of every release, and the costs so far.

    Attributes
    ----------
    layout : BufferLayout
        What the buffers hold.
    statistics : list of BatchStatistics
        One a release.
    flights : int
        Launches of the folded batches.
    steps : int
        Their integration steps.
    kernel_seconds : float
        Processor time [s] of the folded batches.
    folded : int
        Tasks folded so far.
    region : list of float
        What the stop rule's region holds, one number for each folded task; empty without a rule.
    reached : bool
        Whether the stop rule's relative error was reached.
    """

    def __init__(
        self,
        layout: BufferLayout,
        tasks: Sequence[Task],
        releases: int,
        replicates: int,
        rule: StopRule | None = None,
    ) -> None:
        self.layout = layout
        first_batch = tasks[0].batch
        self.statistics = [BatchStatistics(layout, replicates, first_batch) for _ in range(releases)]
        self.flights = 0
        self.steps = 0
        self.kernel_seconds = 0.0
        self.folded = 0
        self.region: list[float] = []
        self.reached = False
        self._rule = rule
        self._tasks = tasks
        self._waiting: dict[Task, BatchResult] = {}

    @property
    def tasks(self) -> int:
        """Tasks that there are at the most."""
        return len(self._tasks)

    @property
    def batches(self) -> int:
        """Batches of which every release has been folded."""
        return self.folded // len(self.statistics)

    @property
    def done(self) -> bool:
        """Whether nothing more is to be folded."""
        return self.reached or self.folded == len(self._tasks)

    def take(self, task: Task, result: BatchResult) -> None:
        """Keep `result` until all tasks before it have come, then fold it: float sums depend on the order.

        What comes behind the batch at which the stop rule was reached is dropped.
        """
        self._waiting[task] = result
        while not self.done and (due := self._tasks[self.folded]) in self._waiting:
            self._fold(due, self._waiting.pop(due))
        if self.done:
            self._waiting.clear()

    def _fold(self, task: Task, result: BatchResult) -> None:
        self.statistics[task.release].fold(result.buffer)
        self.flights += result.flights
        self.steps += result.steps
        self.kernel_seconds += result.kernel_seconds
        self.folded += 1
        if self._rule is not None:
            self.region.append(self._rule.content(task.release, result.buffer))
            self._decide(self._rule)

    def _decide(self, rule: StopRule) -> None:
        if self.folded % len(self.statistics) == 0 and rule.is_due(self.batches):
            self.reached = rule.is_met(self.region_by_batch())

    def region_by_batch(self) -> NDArray[np.float64]:
        """Return what the stop rule's region holds in each whole batch, over all releases."""
        releases = len(self.statistics)
        by_task = np.array(self.region[: self.batches * releases]).reshape(-1, releases)
        return np.asarray(by_task.sum(axis=1))

    def arrays(self) -> list[NDArray[np.float64]]:
        """Return the accumulators themselves, in a fixed order; what the stop rule needs is not among them."""
        return [array for one in self.statistics for array in one.arrays()]

    def go_on_from(self, folded: int, region: Sequence[float]) -> None:
        """Take note that `arrays` were filled with the sums over the first `folded` tasks."""
        releases = len(self.statistics)
        self.folded = folded
        self.region = list(region)
        for release, one in enumerate(self.statistics):
            one.batches = len(range(release, folded, releases))
        if self._rule is not None and folded:
            self._decide(self._rule)

    def relative_error(self) -> float | None:
        """Return the present relative error of the stop rule's region, else of the mean life; None if unknown."""
        if self._rule is not None:
            return self._rule.relative_error_of(self.region_by_batch())
        # The life is the one number that stands for all content.
        means = np.array([tally_views(self.layout, one.mean).life[0] for one in self.statistics])
        batches = min(one.batches for one in self.statistics)
        if batches < 2 or not means.sum() > 0.0:
            return None
        squares = [tally_views(self.layout, one.squared_deviation).life[0] for one in self.statistics]
        variance = sum(
            square / (one.batches * (one.batches - 1))
            for square, one in zip(squares, self.statistics, strict=True)
        )
        return float(np.sqrt(variance) / means.sum())
