"""Ranges: values between two ends, in equal steps or equal ratios, written as a run file has them."""

import numpy as np

from tracer.errors import InputError
from tracer.units import Quantity, as_written, conversion_factor, quoted

DIGITS = 12
"""Digits of a value in a range: more would only show rounding."""


def spaced(
    first: str | float, last: str | float, count: int, spacing: str, subject: str
) -> tuple[str | int | float, ...]:
    """Return the values of a range, both ends included.

    Parameters
    ----------
    first, last : str or number
        Two quantities of one dimension, or two numbers. Values come in the unit of `first`.
    count : int
        Number of values, at least 2.
    spacing : "linear" or "logarithmic"
        Equal steps, or equal ratios between ends of one sign.
    subject : str
        Begins messages.

    Raises
    ------
    InputError
        Ends that are no numbers, of different dimensions, equal, or not of one sign where ratios are asked for.
    """
    start, unit = _number(first, f"{subject}.first")
    end = _number_in(unit, last, f"{subject}.last")
    if start == end:
        raise InputError(f"{subject}.last: {quoted(last)} is the first value again; a range needs two ends")
    if spacing == "logarithmic":
        if not start * end > 0.0:
            raise InputError(
                f"{subject}.spacing: a logarithmic range needs ends above 0, and goes from {quoted(first)} to "
                f"{quoted(last)}"
            )
        numbers = np.sign(start) * np.geomspace(abs(start), abs(end), count)
    else:
        numbers = np.linspace(start, end, count)
    rounded = [float(f"{number:.{DIGITS}g}") for number in numbers]
    if unit is not None:
        return tuple(str(Quantity(number, unit)) for number in rounded)
    if isinstance(first, int) and isinstance(last, int) and all(number.is_integer() for number in rounded):
        return tuple(int(number) for number in rounded)
    return tuple(rounded)


def _number(given: str | float, subject: str) -> tuple[float, str | None]:
    if not isinstance(given, str):
        return float(given), None
    quantity = as_written(given)
    if quantity is None:
        raise InputError(f"{subject}: {quoted(given)} is no number with a unit; a list of values takes words")
    return quantity.value, quantity.unit


def _number_in(unit: str | None, given: str | float, subject: str) -> float:
    value, own = _number(given, subject)
    if own == unit:
        return value
    factor = None if own is None or unit is None else conversion_factor(own, unit)
    if factor is None:
        raise InputError(f"{subject}: {quoted(given)} is not measured in the unit of first, {quoted(unit)}")
    # Degrees of arc, say, are turned into radians with the last digit rounded.
    return float(f"{value * factor:.{DIGITS + 2}g}")
