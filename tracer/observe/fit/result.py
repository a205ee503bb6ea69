"""What a comparison of products with a measured profile gives, as plain records for commands and figures."""

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.units import conversion_factor

Floats = NDArray[np.float64]

READING_UNITS = {"temperature": ("K", "K"), "binding_energy": ("J", "eV"), "cutoff_energy": ("J", "eV")}
"""Unit of a law's parameter, and the one in which people read it."""


class Estimate(NamedTuple):
    """A fitted number with its ranges of 68.27 % and 95 %; an end that meets the edge of what is allowed lies on it."""

    best: float
    low68: float
    high68: float
    low95: float
    high95: float


def as_read(key: str, estimate: Estimate) -> tuple[Estimate, str]:
    """Return the estimate of a law's parameter in the unit in which people read it, and that unit."""
    given, shown = READING_UNITS[key]
    factor = conversion_factor(given, shown) or 1.0
    return Estimate(*(factor * end for end in estimate)), shown


class Points(NamedTuple):
    """The profile and what the best fit makes of it, N points, values in `unit`.

    `position` in `position_unit`, which counts what `position_words` say; `sigma` of the measurement, `model_error` of
    the model, Monte Carlo and bins of launch speed; `upper` marks upper limits; `residual` is (value - model) over both
    errors together; `parts` the releases by name, `background` what was added to them.
    """

    position: Floats
    value: Floats
    sigma: Floats
    upper: NDArray[np.bool_]
    model: Floats
    model_error: Floats
    residual: Floats
    parts: Mapping[str, Floats]
    background: Floats
    unit: str
    position_unit: str
    position_words: str


class Correlations(NamedTuple):
    """Correlation `matrix` (P, P) of the free parameters `names`; NaN for one on an edge, or that does nothing."""

    names: tuple[str, ...]
    matrix: Floats


class RangeEnds(NamedTuple):
    """By how much -2 ln L has risen at the ends of the ranges of 68.27 and 95 % of each free parameter, by its name.

    Of each range the rise at its lower end and at its upper. So many `draws` of profiles about each end, with random
    numbers of `seed`, calibrated them; where it is 0 they are those of chi-square with one degree of freedom.
    """

    draws: int
    seed: int
    rises: Mapping[str, tuple[tuple[float, float], tuple[float, float]]]


class Comparison(NamedTuple):
    """Result of a comparison.

    `rates` [s-1] by release; `parameters` by release and name, temperatures [K], energies [J]; `background` in the unit
    of the points, None where it was not fitted. `chi_square` counts measured points alone; `minus_two_log_likelihood`
    (without constants) upper limits as well. `range_ends` say where ranges end and whether that was calibrated.
    `probability` of a chi-square as large or larger. `statements` say what the fit tells and cannot tell, `warnings`
    what is doubtful.
    """

    title: str
    products: tuple[str, ...]
    what: str
    view: str
    rates: Mapping[str, Estimate]
    held_rates: Mapping[str, float]
    parameters: Mapping[str, Mapping[str, Estimate]]
    background: Estimate | None
    chi_square: float
    degrees_of_freedom: int
    probability: float
    minus_two_log_likelihood: float
    range_ends: RangeEnds
    correlations: Correlations
    points: Points
    statements: tuple[str, ...]
    warnings: tuple[str, ...]
