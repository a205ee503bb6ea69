"""Order of two quantities whose units the run file may mix."""

from tracer.units import RADII, Quantity, si


def is_below(lower: Quantity, upper: Quantity) -> bool:
    """Whether `lower < upper`; True as well where only the body's radius could tell."""
    if (lower.unit == RADII) != (upper.unit == RADII):
        return True
    if lower.unit == RADII:
        return lower.value < upper.value
    return si(lower) < si(upper)
