"""Ticks of logarithmic axes that never crowd."""

import math

from matplotlib.axis import Axis
from matplotlib.ticker import LogFormatterSciNotation, LogLocator, NullFormatter

FEW_DECADES = 2.0
"""Below this the labels 1 and 3 of every decade are shown, above it whole decades alone."""
MOST_LABELS = 8


def set_log_ticks(axis: Axis, low: float, high: float) -> None:
    """Label an axis from `low` to `high`, at least a decade apart, with powers of ten."""
    few = math.log10(high) - math.log10(low) < FEW_DECADES
    axis.set_major_locator(LogLocator(subs=(1.0, 3.0) if few else (1.0,), numticks=MOST_LABELS))
    axis.set_major_formatter(
        LogFormatterSciNotation(labelOnlyBase=False, minor_thresholds=(math.inf, math.inf))
    )
    axis.set_minor_formatter(NullFormatter())
