"""Options that take a quantity with its unit."""

from typing import NamedTuple

from tracer.errors import InputError
from tracer.inputs.interval import Interval
from tracer.units import Quantity, parse, quoted, si


class Measure(NamedTuple):
    """What an option takes: a `dimension` of `tracer.units.DIMENSIONS`, `allowed` in the `unit` of its messages."""

    dimension: str
    unit: str
    allowed: Interval


def si_option(option: str, text: str | None, measure: Measure) -> float | None:
    """Return the value of `text` in SI units, None where the option was not given.

    Raises
    ------
    InputError
        The text is no quantity of the dimension, or out of range.
    """
    if text is None:
        return None
    try:
        value = si(parse(text, measure.dimension))
    except ValueError as error:
        raise InputError(f"{option}: {error}") from None
    if not measure.allowed.holds(value / si(Quantity(1.0, measure.unit))):
        range_words = measure.allowed.words(measure.unit)
        raise InputError(f"{option}: {quoted(text)} is out of range; must be {range_words}")
    return value
