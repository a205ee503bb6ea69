"""What a fit tells in plain words: whether it fits, what cannot be told apart, and which unit may be wrong."""

import itertools
import math
from collections.abc import Iterator, Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from tracer.observe.fit.calibration import Calibration
from tracer.observe.fit.likelihood import RATE
from tracer.observe.fit.ranges import RISE_68, RISE_95, Scan
from tracer.observe.fit.result import Correlations, Estimate
from tracer.observe.optical_depth import THICK

Floats = NDArray[np.float64]

POOR, TOO_GOOD = 0.01, 0.99
"""Probabilities of a chi-square at or above the one found beyond which it is named."""
LOUD_MODEL = 0.5
"""Error of the model over that of the measurement, root mean square over the points, which is named."""
ALIKE = 0.9
"""Size of a correlation that is named."""
SLIP = 100.0
"""Ratio of the measured to the products' own size beyond which the unit is asked after: authors' rates differ by 30."""
NEAR_SLIP = 6.0
"""Ratio to a known slip within which that is named."""

SLIPS: Mapping[str, tuple[tuple[float, str], ...]] = {
    "column": (
        (1e4, "cm-2 and m-2 mixed up"),
        (1e-4, "cm-2 and m-2 mixed up"),
        (1e6, "m-2 and km-2, or a density per cm3 and per m3, mixed up"),
        (1e-6, "m-2 and km-2, or a density per cm3 and per m3, mixed up"),
        (1e8, "cm-2 turned into m-2 twice, or the wrong way,"),
        (1e-8, "cm-2 turned into m-2 twice, or the wrong way,"),
    ),
    "brightness": (
        (1e3, "rayleigh and kilorayleigh mixed up"),
        (1e-3, "rayleigh and kilorayleigh mixed up"),
        (1e6, "rayleigh and megarayleigh, or photons per cm2 and rayleigh, mixed up"),
        (1e-6, "rayleigh and megarayleigh, or photons per cm2 and rayleigh, mixed up"),
        (1e10, "photons per m2 and rayleigh mixed up"),
        (1e-10, "photons per m2 and rayleigh mixed up"),
    ),
}
"""Slips of units by what they do to the values."""


def unit_slip(quantity: str, measured: Floats, sigma: Floats, model: Floats) -> str | None:
    """Return a warning where measured values are of quite another size than those of the products' own rates.

    The ratio is that of weighted least squares, sum(v m/s^2)/sum(m^2/s^2).
    """
    weight = float(np.sum((model / sigma) ** 2))
    ratio = float(np.sum(measured * model / sigma**2)) / weight if weight > 0.0 else math.nan
    if not ratio > 0.0 or 1.0 / SLIP < ratio < SLIP:
        return None
    close = [(abs(math.log(ratio / size)), words) for size, words in SLIPS[quantity]]
    near, words = min(close)
    guess = f"; {words} would do that" if near < math.log(NEAR_SLIP) else ""
    return (
        f"is the unit of the values right? They are {ratio:.3g} times what the products give at their own "
        f"rates{guess}. If it is right, the rates of the run files were far off"
    )


def quality(chi_square: float, degrees: int, probability: float) -> str:
    """Return the verdict on a chi-square."""
    head = f"chi-square {chi_square:.4g} for {degrees} degrees of freedom, probability {probability:.2g}"
    if probability < POOR:
        return (
            f"{head}: a poor fit. The standard errors are too small or the model lacks something; ranges do not count "
            "that and are too narrow"
        )
    if probability > TOO_GOOD:
        return f"{head}: better than chance; the standard errors may be too large, or not independent"
    return f"{head}: the model fits"


def range_words(calibration: Calibration, names: Sequence[str]) -> str:
    """Return where the ranges of the parameters `names` end, and how that was found."""
    wilks = f"{RISE_68:g} and {RISE_95:.2f}"
    if not calibration.draws:
        return f"Ranges of 68 and 95 % end where -2 ln L has risen by {wilks}, not calibrated: {calibration.reason}"
    moved = np.abs(np.log(calibration.rises / np.array([RISE_68, RISE_95])[:, np.newaxis]))
    number, level, side = (int(place) for place in np.unravel_index(np.argmax(moved), moved.shape))
    return (
        f"Ranges are calibrated on {calibration.draws} profiles drawn about each end: where that changes most, at the "
        f"{('lower', 'upper')[side]} end of {(68, 95)[level]} % of '{names[number]}', -2 ln L has risen by "
        f"{calibration.rises[number, level, side]:.3g} instead of {(RISE_68, RISE_95)[level]:.3g}"
    )


def loud_model(model_error: Floats, sigma: Floats) -> str | None:
    """Return a warning where the own error of the model is not small beside that of the measurement."""
    ratio = float(np.sqrt(np.mean((model_error / sigma) ** 2)))
    if ratio <= LOUD_MODEL:
        return None
    return (
        f"the error of the model, Monte Carlo and bins, is {ratio:.2g} times that of the measurement; it is counted, "
        "but known from few replicates: run with more particles"
    )


def thickness(depth: Floats) -> str | None:
    """Return a warning where the gas is not thin to its own light, by optical depths (N,)."""
    thick = int((depth > THICK).sum())
    if not thick:
        return None
    return (
        f"{thick} points have an optical depth above {THICK:g}, up to {depth.max():.2g}: the model scatters light "
        "once and is too bright there, so that rates come out too low"
    )


def told_apart(
    absences: Mapping[tuple[int, ...], float], correlations: Correlations, rates: Mapping[int, str]
) -> Iterator[str]:
    """Yield statements about releases that the profile cannot tell apart.

    `absences` is the rise of -2 ln L without one or two of them, by their slots, which `rates` names.
    """
    named: set[int] = set()
    spare = [number for number in rates if absences[(number,)] < RISE_95]
    for one, other in itertools.combinations(rates, 2):
        size = correlations.matrix[one, other]
        if one in spare and other in spare and absences[(one, other)] >= RISE_95:
            named |= {one, other}
            yield (
                f"'{rates[one]}' and '{rates[other]}' cannot be told apart by this profile: either may be absent "
                "(95 %) while the other explains it, but not both. Their sum is known, their shares are not"
            )
        elif abs(size) > ALIKE:
            yield f"the rates of '{rates[one]}' and '{rates[other]}' hang together: correlation {size:.2f}"
    for number in [one for one in spare if one not in named]:
        yield f"'{rates[number]}' is not needed: the profile is explained without it (95 %)"


def entangled_parameters(correlations: Correlations) -> Iterator[str]:
    """Yield statements about two parameters, not both of them rates, whose correlation is large."""
    names = correlations.names
    for i, j in itertools.combinations(range(len(names)), 2):
        size = correlations.matrix[i, j]
        if abs(size) > ALIKE and not (names[i].endswith(RATE) and names[j].endswith(RATE)):
            yield f"'{names[i]}' and '{names[j]}' hang together: correlation {size:.2f}"


def at_range(label: str, estimate: Estimate, low: float, high: float, unit: str) -> str | None:
    """Return a warning where a law's parameter meets an end of the range it was given."""
    span = f"{low:.5g} to {high:.5g} {unit}"
    if _same(estimate.low95, low) and _same(estimate.high95, high):
        if _same(estimate.low68, low) and _same(estimate.high68, high):
            return f"{label} is not constrained by the profile within its range, {span}"
        return f"{label}: its 95 % range fills all of the range given, {span}"
    for end, words in ((low, "low"), (high, "high")):
        if _same(estimate.best, end):
            return f"{label} lies on the {words} end of its range, {span}: the best value may be beyond"
    for found, end, words in ((estimate.low95, low, "low"), (estimate.high95, high, "high")):
        if _same(found, end):
            return f"{label}: its 95 % range is cut short by the {words} end of the range given, {span}"
    return None


def _same(one: float, other: float) -> bool:
    return abs(one - other) <= 1e-6 * max(abs(one), abs(other))


def correlations_of(scan: Scan, names: Sequence[str]) -> Correlations:
    """Return the correlations of the free parameters near the best."""
    with np.errstate(invalid="ignore", divide="ignore"):
        width = np.sqrt(np.diag(scan.covariance))
        matrix = scan.covariance / np.outer(width, width)
    return Correlations(tuple(names), matrix)
