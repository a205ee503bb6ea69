"""The particle budget: what was released must end somewhere."""

import numpy as np
from numpy.typing import NDArray

CLOSURE = 1e-9
"""Largest relative gap between the atoms released and the sum of their fates."""


def budget_gap(release_rate: float, ledger: NDArray[np.float64]) -> float:
    """Return the relative difference between `release_rate` [s-1] and the sum of `ledger` (fate,) [s-1]."""
    return float(abs(ledger.sum() - release_rate) / release_rate)
