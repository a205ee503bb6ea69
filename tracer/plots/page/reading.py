"""Numbers as people read them in running text."""

import math
import re

SUPERSCRIPTS = str.maketrans("-0123456789", "\N{SUPERSCRIPT MINUS}⁰¹²³⁴⁵⁶⁷⁸⁹")
GAP = "\N{NO-BREAK SPACE}"
SMALLEST_PLAIN, LARGEST_PLAIN = 1e-3, 1e6
_EXPONENT = re.compile(r"(?<=[A-Za-z])-?[0-9]+\b")
_QUANTITY = re.compile(r"([+-]?[0-9]+(?:\.[0-9]*)?(?:[eE][+-]?[0-9]{1,3})?) ([A-Za-z][A-Za-z0-9 /-]*)")
DAY, HOUR, MINUTE = 86400.0, 3600.0, 60.0


def number(value: float, digits: int = 4) -> str:
    """Return a number with `digits` figures, large and small ones with a power of ten."""
    if not math.isfinite(value) or value == 0.0:
        return f"{value:g}"
    if SMALLEST_PLAIN <= abs(value) < LARGEST_PLAIN:
        text = f"{value:.{digits}g}"
        return f"{float(text):,.0f}" if "e" in text or abs(value) >= 10.0**digits else text
    mantissa, _, power = f"{value:.{digits - 1}e}".partition("e")
    if "." in mantissa:
        mantissa = mantissa.rstrip("0").rstrip(".")
    exponent = str(int(power)).translate(SUPERSCRIPTS)
    return f"{mantissa}{GAP}\N{MULTIPLICATION SIGN}{GAP}10{exponent}"


def raised(text: str) -> str:
    """Return a unit such as `cm-2 s-1` with raised exponents."""
    return _EXPONENT.sub(lambda match: match[0].translate(SUPERSCRIPTS), text)


def quantity(text: str) -> str:
    """Return a quantity such as `2e24 s-1` as people read it; any other text as it is."""
    match = _QUANTITY.fullmatch(text)
    return text if match is None else f"{number(float(match[1]))}{GAP}{raised(match[2])}"


def count(value: int) -> str:
    """Return a whole number with its thousands marked."""
    return f"{value:,}"


def duration(seconds: float) -> str:
    """Return a time in the largest of days, hours, minutes and seconds that makes it at least 1."""
    for size, name in ((DAY, "d"), (HOUR, "h"), (MINUTE, "min")):
        if abs(seconds) >= size:
            return f"{number(seconds / size)}{GAP}{name}"
    return f"{number(seconds)}{GAP}s"


def percent(share: float, error: float = math.nan) -> str:
    """Return a share of 1 in per cent, with its standard error where one is known."""
    if not error > 1e-9 * share:
        return f"{100.0 * share:.3g}{GAP}%"
    # Two digits of the error, as is common practice.
    decimals = min(max(1 - math.floor(math.log10(100.0 * error)), 0), 4)
    value, spread = (f"{100.0 * one:.{decimals}f}" for one in (share, error))
    return f"{value}{GAP}\N{PLUS-MINUS SIGN}{GAP}{spread}{GAP}%"
