"""One tallied field with its error, as it goes into the product."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray


class FieldStatistics(NamedTuple):
    """Batch statistics of one tallied field, in product units."""

    mean: NDArray[np.float64]
    """Mean over batches; shaped as the product's variable."""
    standard_error: NDArray[np.float64]
    """Standard error of the mean, shaped as `mean`; NaN where nothing was ever scored."""
    replicates: NDArray[np.floating] | None
    """Means over the groups of batches, shape (replicate, *mean.shape); None where they are not kept."""
