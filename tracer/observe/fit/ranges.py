"""How far a parameter may go before the profile likelihood falls too low, and how parameters hang together."""

import itertools
import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.observe.fit.descent import Valley, descend
from tracer.observe.fit.likelihood import Likelihood

Floats = NDArray[np.float64]

RISE_68, RISE_95 = 1.0, 3.841458820694124
"""Rise of -2 ln L at the ends of the ranges: 68.27 and 95 % of chi-square with one degree of freedom (Wilks 1938, Ann.
Math. Stat. 9, 60: memory)."""
CLOSE = 2e-3
"""How near to the rise an end lies, in its square root."""
MOST_TRIALS = 60
BETTER = 1e-4
"""Fall of -2 ln L below the best that shows another, better minimum."""
ON_EDGE = 1e-9
LEAST_STEP, FAR_STEP = 1.2, 4.0
"""Least and most by which the distance from the best is multiplied while an end lies beyond."""
OTHER_SHARES = (0.2, 0.8)
"""Places in a law parameter's range from which a profile is looked for again."""


class BetterFound(Exception):
    """A scan met parameters that are more likely than the best known."""

    def __init__(self, parameters: Floats) -> None:
        super().__init__("a better minimum")
        self.parameters = parameters


class Scan(NamedTuple):
    """What ranges are taken from: the best parameters, their -2 ln L, their covariance (P, P), all valleys."""

    likelihood: Likelihood
    best: Floats
    value: float
    covariance: Floats
    valleys: tuple[Valley, ...]


def scan_of(likelihood: Likelihood, valleys: tuple[Valley, ...]) -> Scan:
    """Return the scan about the first of the valleys.

    Parameters on an edge, or that do nothing, have no covariance: NaN.
    """
    best, value = valleys[0]
    _, slope = likelihood.residuals(best)
    # The law of a release that is absent changes nothing.
    inside = ~on_edge(likelihood, best) & (np.sum(slope**2, axis=1) > 0.0)
    covariance = np.full((len(best), len(best)), np.nan)
    normal = slope[inside] @ slope[inside].T
    scale = np.sqrt(np.maximum(np.diag(normal), np.finfo(float).tiny))
    covariance[np.ix_(inside, inside)] = np.linalg.pinv(
        normal / np.outer(scale, scale), hermitian=True
    ) / np.outer(scale, scale)
    return Scan(likelihood, best, value, covariance, valleys)


def on_edge(likelihood: Likelihood, parameters: Floats) -> NDArray[np.bool_]:
    """Return which parameters lie on an edge of what is allowed."""
    return np.asarray((parameters <= likelihood.low + ON_EDGE) | (parameters >= likelihood.high - ON_EDGE))


class End(NamedTuple):
    """An end of a parameter's range: its `place`, all `parameters` there; `cut` short by an edge of what is allowed."""

    place: float
    parameters: Floats
    cut: bool


def rise_at(scan: Scan, place: dict[int, float]) -> float:
    """Return by how much -2 ln L rises where some parameters are held at a `place`, the others at their best.

    Raises
    ------
    BetterFound
        With parameters that are more likely than the best known.
    """
    start = scan.best.copy()
    held = np.zeros(len(start), dtype=bool)
    for number, value in place.items():
        start[number], held[number] = value, True
    _, value = _least(scan, [start, *other_starts(scan, start, held)], held)
    return max(0.0, value - scan.value)


def absences(scan: Scan) -> dict[tuple[int, ...], float]:
    """Return by how much -2 ln L rises without each release whose rate is free, and without each two of them.

    Raises
    ------
    BetterFound
        With parameters that are more likely than the best known.
    """
    rates = [
        n for n, slot in enumerate(scan.likelihood.slots) if slot.key is None and slot.component is not None
    ]
    groups = [*((n,) for n in rates), *itertools.combinations(rates, 2)]
    return {group: rise_at(scan, dict.fromkeys(group, 0.0)) for group in groups}


def end_of(scan: Scan, number: int, rise: float, sign: float) -> End:
    """Return the lower or upper end, by `sign`, of a parameter's range; one that is cut short lies on the edge.

    Where -2 ln L has several valleys within `rise`, the range reaches from the first to the last of them: what is as
    likely as the rest of a range must not lie outside because a hill stands before it.

    Raises
    ------
    BetterFound
        With parameters that are more likely than the best known.
    """
    likelihood, wanted = scan.likelihood, math.sqrt(rise)
    edge = float((likelihood.low if sign < 0.0 else likelihood.high)[number])
    start, value = max(
        (one for one in scan.valleys if one.value - scan.value < rise),
        key=lambda one: sign * float(one.parameters[number]),
    )
    best = float(start[number])
    if sign * (edge - best) <= ON_EDGE:
        return End(edge, start, True)
    inner, outer = best, math.nan
    low_root, high_root = _root(scan, value), math.nan
    place = best + sign * _width(scan, number, best) * wanted
    for _ in range(MOST_TRIALS):
        place = min(place, edge) if sign > 0.0 else max(place, edge)
        start, root = _profile(scan, number, place, start, wanted)
        if abs(root - wanted) < CLOSE:
            break
        if root < wanted:
            if place == edge:
                return End(edge, start, True)
            inner, low_root = place, root
        else:
            outer, high_root = place, root
        if math.isnan(outer):
            # sqrt(rise) runs nearly straight with the distance from the best.
            factor = 1.05 * wanted / root if root > 0.0 else FAR_STEP
            place = best + min(max(factor, LEAST_STEP), FAR_STEP) * (place - best)
        elif abs(outer - inner) <= 1e-10 * (1.0 + abs(best)):
            break
        else:
            share = (wanted - low_root) / (high_root - low_root)
            place = inner + min(max(share, 0.05), 0.95) * (outer - inner)
    return End(place, start, False)


def _width(scan: Scan, number: int, best: float) -> float:
    """Return a width to begin with: of the covariance, or where there is none what the parameter alone would have."""
    likelihood, variance = scan.likelihood, scan.covariance[number, number]
    if math.isfinite(variance) and variance > 0.0:
        return math.sqrt(variance)
    at = np.where(np.isfinite(likelihood.low), likelihood.low, 0.0)
    at = np.where(np.isfinite(likelihood.high), 0.5 * (at + likelihood.high), at)
    at[number] = best
    slope = likelihood.residuals(at)[1][number]
    norm = float(np.sqrt(slope @ slope))
    span = likelihood.high[number] - likelihood.low[number]
    width = 1.0 / norm if norm > 0.0 else 0.1
    return float(min(width, 0.25 * span)) if math.isfinite(span) else width


def _profile(scan: Scan, number: int, place: float, near: Floats, wanted: float) -> tuple[Floats, float]:
    """Return the parameters at their best for one of them held at `place`, and the square root of the rise.

    Where that is about the root `wanted` or beyond, other starts than `near` are tried as well: other parameters may do
    better far from where they were on the way here, and a place that is taken to lie outside is not looked at again.
    """
    start = near.copy()
    start[number] = place
    held = np.zeros(len(start), dtype=bool)
    held[number] = True
    found, value = _least(scan, [start], held)
    if _root(scan, value) > wanted - CLOSE:
        found, value = _least(scan, [found, *other_starts(scan, found, held)], held)
    return found, _root(scan, value)


def _root(scan: Scan, value: float) -> float:
    return math.sqrt(max(0.0, value - scan.value))


def other_starts(scan: Scan, near: Floats, held: NDArray[np.bool_]) -> list[Floats]:
    """Return `near` with one law parameter after the other, as far as free, moved to either side of its range."""
    low, high = scan.likelihood.low, scan.likelihood.high
    starts = []
    for number in np.flatnonzero(np.isfinite(low) & np.isfinite(high) & ~held):
        for share in OTHER_SHARES:
            start = near.copy()
            start[number] = low[number] + share * (high[number] - low[number])
            starts.append(start)
    return starts


def _least(scan: Scan, starts: Sequence[Floats], held: NDArray[np.bool_]) -> tuple[Floats, float]:
    found, values = descend(scan.likelihood, np.array(starts), held)
    lowest = int(np.argmin(values))
    value = float(values[lowest])
    if value < scan.value - BETTER:
        raise BetterFound(found[lowest])
    return found[lowest], value
