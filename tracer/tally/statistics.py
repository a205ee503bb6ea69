"""Mean and standard error over batches, folded one batch at a time."""

import numpy as np
from numpy.typing import NDArray

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

    def __init__(self, layout: BufferLayout, replicates: int) -> None:
        self.batches = 0
        self.mean = np.zeros(layout.size)
        self.squared_deviation = np.zeros(layout.size)
        self.replicate_sum = np.zeros((replicates, layout.replicated_size))

    def fold(self, buffer: Floats) -> None:
        """Take in the next batch's buffer; batches must come in order, since float sums depend on it.

        The stable update of Welford 1962, Technometrics 4, 419: the squared deviation never goes negative.
        """
        replicates, size = self.replicate_sum.shape
        if replicates:
            self.replicate_sum[self.batches % replicates] += buffer[:size]
        self.batches += 1
        deviation = buffer - self.mean
        self.mean += deviation / self.batches
        deviation *= buffer - self.mean
        self.squared_deviation += deviation

    def standard_error(self) -> Floats:
        """Return the standard error of the mean; NaN where nothing was ever scored or with fewer than two batches."""
        if self.batches < 2:
            return np.full_like(self.mean, np.nan)
        error = np.sqrt(self.squared_deviation / (self.batches * (self.batches - 1)))
        error[self.mean == 0.0] = np.nan
        return error

    def replicate_means(self) -> Floats:
        """Return each replicate's mean over its batches, shape (replicates, layout.replicated_size)."""
        replicates = self.replicate_sum.shape[0]
        counts = np.array([len(range(i, self.batches, replicates)) for i in range(replicates)], dtype=float)
        return np.asarray(self.replicate_sum / counts[:, np.newaxis])
