"""Times that run from seconds to ages."""

from tracer.constants import JULIAN_YEAR, SOLAR_SYSTEM_AGE

DAY = 86400.0
AGE_IN_GYR = f"{SOLAR_SYSTEM_AGE / (1e9 * JULIAN_YEAR):.4g}"
LONGEST = 1e6 * 1e9 * JULIAN_YEAR
"""Beyond this a time stands for `for ever` and its figures say nothing."""

_SCALES = (
    (1e9 * JULIAN_YEAR, "Gyr"),
    (1e6 * JULIAN_YEAR, "Myr"),
    (1e3 * JULIAN_YEAR, "kyr"),
    (JULIAN_YEAR, "yr"),
    (DAY, "d"),
    (3600.0, "h"),
)


def duration(seconds: float) -> str:
    """Return `seconds` in three figures and the unit people think in: s, h, d, yr, kyr, Myr or Gyr."""
    if seconds > LONGEST:
        return "> 1e6 Gyr"
    for size, unit in _SCALES:
        if seconds >= size:
            return f"{_three_figures(seconds / size)} {unit}"
    return f"{_three_figures(seconds)} s"


def _three_figures(value: float) -> str:
    return f"{value:.0f}" if 1e6 > value >= 99.95 else f"{value:.3g}"
