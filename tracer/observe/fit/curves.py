"""What a source makes of a profile as the parameters of its launch-speed law vary."""

import math
from collections.abc import Callable, Mapping
from typing import NamedTuple, Protocol, TypeVar

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from tracer.errors import InputError
from tracer.observe.fit.sources import Response
from tracer.observe.responses import law_doubt, law_weights
from tracer.observe.within_bins import bias_bound
from tracer.physics.release.laws import SpeedDensity
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.physics.release.speed.maxwell_gas import MaxwellGas
from tracer.physics.release.speed.sigmund_thompson import SigmundThompson

Floats = NDArray[np.float64]
Found = TypeVar("Found")

NODES = 97
"""Values of a parameter at which a curve is computed; between them it is a cubic spline in the logarithm."""
STEP = 1e-4
"""Step in the logarithm of a parameter for slopes of laws with several."""

LAWS: Mapping[str, Callable[..., SpeedDensity]] = {
    "maxwell-flux": lambda temperature: MaxwellFlux(temperature),
    "maxwell-gas": lambda temperature: MaxwellGas(temperature),
    "sigmund-thompson": lambda binding_energy, cutoff_energy: SigmundThompson(binding_energy, cutoff_energy),
}


class Parameter(NamedTuple):
    """A law's parameter that is fitted, with the ends of its range in SI units."""

    key: str
    low: float
    high: float


class Curve(Protocol):
    """A source's profile for one atom per second over the logarithms of its fitted parameters, K of them."""

    parameters: tuple[Parameter, ...]

    def at(self, logs: Floats) -> tuple[Floats, Floats]:
        """Return the points (..., N) and their slopes (..., K, N) at logarithms (..., K), of one set or of many."""
        ...

    def replicates_at(self, logs: Floats) -> Floats:
        """Return the replicates (G, N) at logarithms (K,)."""
        ...

    def bias_at(self, logs: Floats) -> Floats:
        """Return how far off (N,) the bins of launch speed may put the points at logarithms (K,), at least 0."""
        ...


class Fixed:
    """A profile without anything to fit but its rate."""

    parameters: tuple[Parameter, ...] = ()

    def __init__(self, mean: Floats, replicates: Floats) -> None:
        self._mean, self._replicates = mean, replicates

    def at(self, logs: Floats) -> tuple[Floats, Floats]:
        """Return what `Curve.at` does."""
        size = len(self._mean)
        return np.broadcast_to(self._mean, (*logs.shape[:-1], size)), np.zeros((*logs.shape, size))

    def replicates_at(self, logs: Floats) -> Floats:
        """Return what `Curve.replicates_at` does."""
        return self._replicates

    def bias_at(self, logs: Floats) -> Floats:
        """Return what `Curve.bias_at` does: nothing, since no bins are asked."""
        return np.zeros_like(self._mean)


class Lawful:
    """A profile from responses by launch speed, for a law with some parameters held and others fitted."""

    def __init__(
        self, response: Response, law: str, held: Mapping[str, float], fitted: tuple[Parameter, ...]
    ) -> None:
        self.parameters = fitted
        self._response, self._law, self._held = response, law, dict(held)
        self._spline: Floats | None = None
        if len(fitted) == 1:
            logs = np.linspace(math.log(fitted[0].low), math.log(fitted[0].high), NODES)
            values = np.array([self._mean(np.array([one])) for one in logs])
            self._nodes, self._spline = logs, CubicSpline(logs, values).c
        elif fitted:
            # The ends of ranges must be covered, which shows before any fit.
            for ends in np.array([[p.low, p.high] for p in fitted]).T:
                self._mean(np.log(ends))

    def at(self, logs: Floats) -> tuple[Floats, Floats]:
        """Return what `Curve.at` does."""
        if self._spline is None:
            # A law may have none to fit: then there are no numbers from which to infer how many sets there are.
            sets = logs.reshape(math.prod(logs.shape[:-1]), logs.shape[-1])
            each = [self._by_differences(one) for one in sets]
            points, slopes = (np.array(part) for part in zip(*each, strict=True))
            size = points.shape[-1]
            return points.reshape(*logs.shape[:-1], size), slopes.reshape(*logs.shape, size)
        log = logs[..., 0]
        step = self._nodes[1] - self._nodes[0]
        place = ((log - self._nodes[0]) / step).astype(int)
        place = np.minimum(np.maximum(place, 0), NODES - 2)
        points, slopes = _cubic(self._spline[:, place], (log - self._nodes[place])[..., np.newaxis])
        return points, slopes[..., np.newaxis, :]

    def replicates_at(self, logs: Floats) -> Floats:
        """Return what `Curve.replicates_at` does."""
        found = np.einsum("bo,gbon->gn", self._weights(logs), self._response.replicates, optimize=True)
        return np.asarray(found)

    def bias_at(self, logs: Floats) -> Floats:
        """Return what `Curve.bias_at` does."""
        seen = self._response
        doubt = self._asked(logs, lambda law: law_doubt(law, seen.edges, seen.mass))
        return bias_bound(doubt, seen.edges, seen.escape, seen.means)

    def _by_differences(self, logs: Floats) -> tuple[Floats, Floats]:
        """Return points (N,) and slopes (K, N) at logarithms (K,), by differences."""
        mean = self._mean(logs)
        slopes = np.empty((len(logs), len(mean)))
        for k in range(len(logs)):
            step = STEP * np.eye(len(logs))[k]
            slopes[k] = (self._mean(logs + step) - self._mean(logs - step)) / (2.0 * STEP)
        return mean, slopes

    def _mean(self, logs: Floats) -> Floats:
        return np.asarray(np.einsum("bo,bon->n", self._weights(logs), self._response.means, optimize=True))

    def _weights(self, logs: Floats) -> Floats:
        seen = self._response
        return self._asked(logs, lambda law: law_weights(law, seen.edges, seen.mass, seen.escape))

    def _asked(self, logs: Floats, question: Callable[[SpeedDensity], Found]) -> Found:
        """Return the answer for the law with these parameters; an error says what they were."""
        values = {p.key: math.exp(log) for p, log in zip(self.parameters, logs, strict=True)}
        try:
            return question(LAWS[self._law](**self._held, **values))
        except InputError as error:
            words = ", ".join(f"{key} {value:.6g}" for key, value in {**self._held, **values}.items())
            raise InputError(f"{self._law} with {words}: {error}") from None


def _cubic(terms: Floats, x: Floats) -> tuple[Floats, Floats]:
    """Return value and slope at `x` of a cubic whose four `terms` stand highest power first.

    Written out: a descent asks thousands of times, and a call of the library costs more than the sum.
    """
    cube, square, straight, constant = terms
    return ((cube * x + square) * x + straight) * x + constant, (3.0 * cube * x + 2.0 * square) * x + straight
