"""The particle budget: what was released must end somewhere."""

import numpy as np
from numpy.typing import NDArray

CLOSURE = 1e-9
"""Largest relative gap between the atoms released and the sum of their fates."""


def budget_gap(release_rate: float, ledger: NDArray[np.float64], roulette_balance: float = 0.0) -> float:
    """Return the difference between what there was and the sum of `ledger` (fate,) [s-1], over `release_rate` [s-1].

    There was what was released and `roulette_balance` [s-1], what roulette added, which may be negative.
    """
    return float(abs(ledger.sum() - release_rate - roulette_balance) / release_rate)
