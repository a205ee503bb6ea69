"""The fit itself: the lowest valley of -2 ln L, the model's error there, and how far each parameter may go."""

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.observe.fit.calibration import Calibration, calibrated
from tracer.observe.fit.descent import Valley, grid_starts, valleys
from tracer.observe.fit.likelihood import Component, Likelihood, Measured, Slot
from tracer.observe.fit.ranges import BetterFound, Scan, absences, end_of, scan_of
from tracer.observe.fit.result import Estimate

Floats = NDArray[np.float64]

PASSES = 4
"""Fits after which the model's error, which follows the rates, is taken as it is."""
SETTLED = 1e-3
"""Change of -2 ln L between passes that ends them."""
MOST_RESTARTS = 5


class Fitted(NamedTuple):
    """A fit that has arrived: the scan about its best, all ranges, what lacks without releases, where ranges end."""

    scan: Scan
    ranges: tuple[Estimate, ...]
    absences: dict[tuple[int, ...], float]
    calibration: Calibration

    @property
    def best(self) -> Floats:
        """The best parameters, as the likelihood counts them."""
        return self.scan.best


def fit(data: Measured, components: Sequence[Component], slots: Sequence[Slot]) -> Fitted:
    """Return the best parameters and their ranges.

    The model's own error, Monte Carlo and bins of launch speed, follows rates and laws: fits and errors take turns
    until they agree, and calibration and ranges are taken with the error at the best.

    Raises
    ------
    InputError
        Where one better minimum after the other is met, or bins do not cover a law.
    """
    likelihood = Likelihood(data, components, slots)
    known: tuple[Floats, ...] = ()
    for _ in range(MOST_RESTARTS):
        scan = scan_of(likelihood, settled(likelihood, known))
        try:
            calibration = calibrated(scan)
            ranges = tuple(_estimate(scan, n, calibration.rises[n]) for n in range(len(slots)))
            return Fitted(scan, ranges, absences(scan), calibration)
        except BetterFound as found:
            known = (found.parameters,)
    raise InputError("the fit finds better and better parameters without end; give narrower ranges")


def settled(likelihood: Likelihood, known: tuple[Floats, ...]) -> tuple[Valley, ...]:
    """Return the valleys of -2 ln L, the lowest first, with the model's error taken there; `known` are starts."""
    likelihood.take_model_error(valleys(likelihood, known or grid_starts(likelihood))[0].parameters)
    found = valleys(likelihood, (*known, *grid_starts(likelihood)))
    for _ in range(PASSES):
        likelihood.take_model_error(found[0].parameters)
        before, found = found[0].value, valleys(likelihood, [one.parameters for one in found])
        if abs(found[0].value - before) < SETTLED:
            break
    return found


def _estimate(scan: Scan, number: int, rises: Floats) -> Estimate:
    (low68, high68), (low95, high95) = (
        (end_of(scan, number, float(low), -1.0).place, end_of(scan, number, float(high), 1.0).place)
        for low, high in rises
    )
    found = Estimate(float(scan.best[number]), low68, high68, low95, high95)
    slot = scan.likelihood.slots[number]
    if slot.key is None:
        return Estimate(*(slot.unit * end for end in found))
    given = scan.likelihood.components[slot.component or 0].curve.parameters
    edges = next(one for one in given if one.key == slot.key)
    # An end that lies on an edge of the range is that edge, not what rounding makes of its logarithm.
    return Estimate(*(min(max(math.exp(end), edges.low), edges.high) for end in found))
