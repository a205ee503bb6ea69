"""Limits of logarithmic axes for curves."""

import math
from collections.abc import Sequence

import numpy as np

from tracer.plots.colour_scale import SMALLEST
from tracer.plots.field import Field

MOST_DECADES = 9.0
ROOM = 0.08
"""Free room at either end, over the whole."""
LARGEST = 1e300


def log_range(fields: Sequence[Field], decades: float = MOST_DECADES) -> tuple[float, float] | None:
    """Return limits for all values that were counted, a decade to about `decades` apart; None without any."""
    hit = [one.value[one.hit] for one in fields]
    values = np.concatenate(hit) if hit else np.array([])
    if not values.size:
        return None
    top = math.log10(min(max(float(values.max()), SMALLEST), LARGEST))
    low = max(math.log10(max(float(values.min()), SMALLEST)), top - decades)
    room = max(ROOM * (top - low), 0.5 * (1.0 - (top - low)), 0.05)
    return 10.0 ** (low - room), 10.0 ** (top + room)
