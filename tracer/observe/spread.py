"""Standard errors from replicates: the same sum over each group of batches, and how these differ."""

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


def standard_error(replicates: Floats, batches: Floats) -> Floats:
    """Return the standard error of the mean over all batches.

    Parameters
    ----------
    replicates : ndarray, shape (..., G)
        The sum of interest by replicate, each the mean over its batches.
    batches : ndarray, shape (G,)
        Batches in each replicate.

    Returns
    -------
    ndarray, shape (...)
        sqrt(sum_i b_i (x_i - x)^2 / ((G - 1) B)), x the mean over all B = sum b_i batches: batches are independent
        and alike, so that a replicate varies as 1/b_i. NaN with fewer than two replicates.
    """
    groups, total = len(batches), float(np.sum(batches))
    if groups < 2:
        return np.full(replicates.shape[:-1], np.nan)
    # Squares of numbers of any size: relative to the largest they stay within a float's range.
    scale = np.max(np.abs(replicates), axis=-1, keepdims=True)
    scale = np.where(scale > 0.0, scale, 1.0)
    scaled = replicates / scale
    mean = np.sum(scaled * batches, axis=-1, keepdims=True) / total
    variance = np.sum(batches * (scaled - mean) ** 2, axis=-1) / ((groups - 1) * total)
    return np.asarray(scale[..., 0] * np.sqrt(variance))
