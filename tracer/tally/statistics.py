"""Mean and standard error over batches, folded one batch at a time."""

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from tracer.kernels.folding import fold_batch
from tracer.tally.buffer import BufferLayout

Floats = NDArray[np.float64]


class BatchStatistics:
    """Running mean, squared deviations and replicate sums of the buffers of one release.

    Attributes
    ----------
    batches : int
        Batches folded so far.
    mean, squared_deviation : ndarray, shape (layout.size,)
        Mean of the buffers and sum of squared deviations from it.
    replicate_sum : ndarray, shape (replicates, layout.replicated_size)
        Sums of the leading part of the buffers; batch b counts into replicate b mod replicates.
    """

    def __init__(self, layout: BufferLayout, replicates: int, first_batch: int = 0) -> None:
        self.batches = 0
        self.first_batch = first_batch
        self.mean = np.zeros(layout.size)
        self.squared_deviation = np.zeros(layout.size)
        self.replicate_sum = np.zeros((replicates, layout.replicated_size))

    def fold(self, buffer: Floats) -> None:
        """Take in the next batch's buffer; batches must come in order, since float sums depend on it."""
        replicates, size = self.replicate_sum.shape
        if replicates:
            self.replicate_sum[(self.first_batch + self.batches) % replicates] += buffer[:size]
        self.batches += 1
        fold_batch(buffer, self.batches, self.mean, self.squared_deviation)

    def standard_error(self) -> Floats:
        """Return the standard error of the mean; NaN where nothing was ever scored or with fewer than two batches."""
        if self.batches < 2:
            return np.full_like(self.mean, np.nan)
        error = np.sqrt(self.squared_deviation / (self.batches * (self.batches - 1)))
        error[self.mean == 0.0] = np.nan
        return error

    def arrays(self) -> tuple[Floats, Floats, Floats]:
        """Return the accumulators themselves, in a fixed order: all that a checkpoint needs beside `batches`."""
        return self.mean, self.squared_deviation, self.replicate_sum

    @property
    def groups(self) -> int:
        """Number of replicates into which a batch was counted."""
        return min(len(self.replicate_sum), self.batches)

    def replicate_means(self) -> Iterator[Floats]:
        """Yield the mean, shape (layout.replicated_size,), of each replicate that has batches."""
        replicates = len(self.replicate_sum)
        for row, count in zip(
            self.replicate_sum, replicate_counts(self.first_batch, self.batches, replicates), strict=True
        ):
            if count:
                yield row / count


def compile_folding() -> None:
    """Compile or load what `BatchStatistics.fold` calls."""
    fold_batch(np.zeros(1), 1, np.zeros(1), np.zeros(1))


def replicate_counts(first_batch: int, batches: int, replicates: int) -> list[int]:
    """Return how many of `batches` batches from `first_batch` on count into each replicate."""
    return [len(range((i - first_batch) % replicates, batches, replicates)) for i in range(replicates)]
