"""How likely a profile is for rates, background and law parameters: as squares, measured points and limits alike."""

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import solve_triangular
from scipy.special import log_ndtr

from tracer.observe.fit.curves import Curve
from tracer.observe.fit.sources import covariance

Floats = NDArray[np.float64]
Truths = NDArray[np.bool_]

TINY = 1e-150
COMMON = 0.5
"""Correlation between two points of what the bins of launch speed may put wrong in a model."""
RATE = ": rate"
"""Ending of the names of rates among the free parameters."""


class Component(NamedTuple):
    """A source in the fit: its `curve`, batches by replicate (G,), the rate [s-1] at which it is held, None if free."""

    name: str
    curve: Curve
    batches: Floats
    held_rate: float | None


class Slot(NamedTuple):
    """A free parameter of the fit, as the descent sees it: within `low` and `high`.

    A rate counts in `unit` [s-1], a background in `unit` of the points, and a law's parameter by its logarithm. `key`
    is None of a rate and `component` None of the background.
    """

    name: str
    component: int | None
    key: str | None
    low: float
    high: float
    unit: float


class Measured(NamedTuple):
    """N points: `value`, `sigma`, which of them are `upper` limits; `level` is the known background."""

    value: Floats
    sigma: Floats
    upper: Truths
    level: float


def slots_of(data: Measured, components: Sequence[Component], background: bool) -> tuple[Slot, ...]:
    """Return the free parameters: rates, then the background, then the laws' parameters."""
    size = float(np.median(np.abs(data.value[~data.upper]))) or float(np.median(data.sigma))
    slots = []
    for i, one in enumerate(components):
        if one.held_rate is None:
            middle = one.curve.at(np.array([0.5 * math.log(p.low * p.high) for p in one.curve.parameters]))[0]
            largest = float(np.max(np.abs(middle)))
            slots.append(
                Slot(one.name + RATE, i, None, 0.0, math.inf, size / largest if largest > 0.0 else 1.0)
            )
    if background:
        slots.append(Slot("background", None, None, -math.inf, math.inf, size))
    for i, one in enumerate(components):
        slots += [
            Slot(f"{one.name}: {p.key}", i, p.key, math.log(p.low), math.log(p.high), 1.0)
            for p in one.curve.parameters
        ]
    return tuple(slots)


class Model(NamedTuple):
    """Points of the model: the parts (components, N) at their rates, the background (N,), and rates (components,)."""

    parts: Floats
    background: Floats
    rates: Floats

    @property
    def total(self) -> Floats:
        """All together, (N,)."""
        return np.asarray(self.parts.sum(axis=0) + self.background)


class Likelihood:
    """-2 ln L of a profile, without constants, as a sum of squares.

    Measured points are Gaussian with the covariance of measurement and model together; the likelihood of an upper limit
    is Phi((limit - model)/sigma), that of data censored at the limit (as in survival analysis: Feigelson & Nelson 1985,
    ApJ 293, 192; memory), and its square root of -2 ln Phi stands among the residuals.
    """

    def __init__(self, data: Measured, components: Sequence[Component], slots: Sequence[Slot]) -> None:
        self.data, self.components, self.slots = data, tuple(components), tuple(slots)
        self.low = np.array([slot.low for slot in slots])
        self.high = np.array([slot.high for slot in slots])
        self._measured = ~data.upper
        self._law_places = [
            [n for n, slot in enumerate(slots) if slot.component == i and slot.key is not None]
            for i in range(len(components))
        ]
        self._rate_places = [
            next((n for n, slot in enumerate(slots) if slot.component == i and slot.key is None), None)
            for i in range(len(components))
        ]
        self._background = next((n for n, slot in enumerate(slots) if slot.component is None), None)
        self.take_model_error(None)

    def take_model_error(self, parameters: Floats | None) -> None:
        """Count the error of the model at these parameters, Monte Carlo and bins, from now on; none at all for None."""
        data, keep = self.data, self._measured
        self.model_covariance = (
            np.zeros((len(data.value),) * 2) if parameters is None else self._model_covariance(parameters)
        )
        whole = self.model_covariance[np.ix_(keep, keep)] + np.diag(data.sigma[keep] ** 2)
        # Scaled by the measurement: its numbers may be of any size.
        scale = data.sigma[keep]
        root = np.linalg.cholesky(whole / np.outer(scale, scale))
        self._whiten = solve_triangular(root, np.eye(len(scale)), lower=True) / scale
        variance = data.sigma**2 + np.diag(self.model_covariance)
        self.total_sigma = np.sqrt(variance)

    def model(self, parameters: Floats) -> Model:
        """Return the points of the model."""
        rates = np.array([self._rate(i, parameters) for i in range(len(self.components))])
        parts = np.array(
            [
                one.curve.at(parameters[at])[0]
                for one, at in zip(self.components, self._law_places, strict=True)
            ]
        )
        return Model(rates[:, None] * parts, np.full(parts.shape[1], self._level(parameters)), rates)

    def residuals(self, parameters: Floats, values: Floats | None = None) -> tuple[Floats, Floats]:
        """Return residuals (..., N), whose squares sum to -2 ln L, and their slopes (..., P, N); limits stand last.

        Parameters
        ----------
        parameters : ndarray, shape (..., P)
            The parameters, of one or of many.
        values : ndarray, shape (..., N), optional
            Profiles in place of the measured one, whose limits stay limits.
        """
        values = self.data.value if values is None else values
        total, steps = self._predicted(parameters)
        if not self.data.upper.any():
            return (values - total) @ self._whiten.T, -(steps @ self._whiten.T)
        keep = self._measured
        away = (values[..., keep] - total[..., keep]) @ self._whiten.T
        limits, tilts = self._limits(values[..., ~keep] - total[..., ~keep])
        turned = -(steps[..., keep] @ self._whiten.T), tilts[..., np.newaxis, :] * steps[..., ~keep]
        return np.concatenate([away, limits], axis=-1), np.concatenate(turned, axis=-1)

    def noise(self, normal: Floats) -> Floats:
        """Return errors (D, N) of measurement and model together, from D sets of standard normal numbers (D, N).

        Raises
        ------
        ValueError
            Where a point is an upper limit.
        """
        if self.data.upper.any():
            raise ValueError("upper limits have no Gaussian error")
        return np.asarray(solve_triangular(self._whiten, normal.T, lower=True).T)

    def chi_square(self, parameters: Floats) -> float:
        """Return the chi-square of the measured points alone."""
        found = self.residuals(parameters)[0][: int(self._measured.sum())]
        return float(found @ found)

    def _limits(self, away: Floats) -> tuple[Floats, Floats]:
        sigma = self.total_sigma[self.data.upper]
        z = away / sigma
        log = log_ndtr(z)
        root = np.sqrt(np.maximum(-2.0 * log, TINY))
        hazard = np.exp(-0.5 * z * z - log) / math.sqrt(2.0 * math.pi)
        return root, hazard / (sigma * root)

    def _level(self, parameters: Floats) -> float:
        if self._background is None:
            return self.data.level
        return float(parameters[self._background] * self.slots[self._background].unit)

    def _rate(self, number: int, parameters: Floats) -> Floats:
        """Return the rates (...) [s-1] of a component at parameters (..., P)."""
        place = self._rate_places[number]
        if place is None:
            return np.full(parameters.shape[:-1], self.components[number].held_rate)
        return np.asarray(parameters[..., place] * self.slots[place].unit)

    def _predicted(self, parameters: Floats) -> tuple[Floats, Floats]:
        """Return the points (..., N) of the model at parameters (..., P), and their slopes (..., P, N)."""
        total = np.zeros((*parameters.shape[:-1], len(self.data.value)))
        steps = np.zeros((*parameters.shape, len(self.data.value)))
        for i, one in enumerate(self.components):
            points, slopes = one.curve.at(parameters[..., self._law_places[i]])
            rate, place = self._rate(i, parameters)[..., np.newaxis], self._rate_places[i]
            total += rate * points
            if place is not None:
                steps[..., place, :] = self.slots[place].unit * points
            for k, n in enumerate(self._law_places[i]):
                steps[..., n, :] = rate * slopes[..., k, :]
        if self._background is None:
            return total + self.data.level, steps
        unit = self.slots[self._background].unit
        steps[..., self._background, :] = unit
        return total + unit * parameters[..., self._background, np.newaxis], steps

    def _model_covariance(self, parameters: Floats) -> Floats:
        whole = np.zeros((len(self.data.value),) * 2)
        for i, one in enumerate(self.components):
            rate, logs = self._rate(i, parameters), parameters[self._law_places[i]]
            whole += rate**2 * covariance(one.curve.replicates_at(logs), one.batches)
            # What the bins' width does has the law's part in common for all points, while the response's part changes
            # from point to point by an unknown size and sign. As if common to all, a fit would take it away with one
            # number; as if each point's own, many points would average it out. Half of it is either.
            bias = rate * one.curve.bias_at(logs)
            whole += COMMON * np.outer(bias, bias) + (1.0 - COMMON) * np.diag(bias**2)
        return whole
