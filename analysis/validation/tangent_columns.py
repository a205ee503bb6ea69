"""What an observer makes of tangent lines of sight: e-folding lengths, and the temperature of Chamberlain's gas.

The studies of published shapes share this; each has its strips of pixels as images of its run files, seen from north:
one along +x, tangent at noon, or along -y, tangent at dawn.
"""

from math import sqrt
from typing import NamedTuple

import numpy as np

from tracer.constants import BOLTZMANN
from tracer.physics.chamberlain import density_ratio

PIECES = np.sqrt([0.0, 0.003, 0.03, 0.3, 3.0, 30.0, 300.0])
"""Roots of the distances [radii] from the tangent point between which Chamberlain's gas is integrated."""

RANGES = ((0.1, 1.0), (0.5, 3.0), (1.0, 5.0))
"""Tangent altitudes over published e-folding lengths."""
RANGE = RANGES[1]
"""That of the verdicts."""


def _nodes() -> tuple[np.ndarray, np.ndarray]:
    x, weight = np.polynomial.legendre.leggauss(16)
    half = 0.5 * np.diff(PIECES)[:, np.newaxis]
    return (PIECES[:-1, np.newaxis] + half * (x + 1.0)).ravel(), (half * weight).ravel()


NODES, WEIGHTS = _nodes()


class Strip(NamedTuple):
    """Tangent altitudes (N,) [m], a quantity along the line of sight (N,), and its replicates (G, N)."""

    altitude: np.ndarray
    value: np.ndarray
    replicates: np.ndarray


class Measured(NamedTuple):
    """A value and its standard error from the replicates."""

    value: float
    error: float

    def __str__(self) -> str:
        return f"{self.value:.4g} +- {self.error:.2g}"


def strip(ds, image, quantity="column", release=None) -> Strip:
    """Return what a strip shows: the sum over all releases or one of them, and over all lines."""
    radius = ds.attrs["body_radius"]
    horizontal, vertical = (ds[f"{image}_{axis}"].values for axis in ("horizontal", "vertical"))
    altitude = (horizontal if horizontal.size > 1 else -vertical) - radius
    value, replicates = (ds[f"{quantity}_{image}{ending}"] for ending in ("", "_replicates"))
    if release is not None:
        value, replicates = value.sel(release=[release]), replicates.sel(release=[release])
    over = [axis for axis in ("line", "release") if axis in value.dims]
    value = value.sum(over).values.ravel()
    replicates = replicates.astype(np.float64).sum(over)
    replicates = replicates.values.reshape(replicates.sizes["replicate"], -1)
    order = np.argsort(altitude)
    return Strip(altitude[order], value[order], replicates[:, order])


def between(one: Strip, low: float, high: float) -> Strip:
    """Return the part of a strip between two tangent altitudes [m]."""
    inside = (one.altitude >= low) & (one.altitude <= high)
    return Strip(one.altitude[inside], one.value[inside], one.replicates[:, inside])


def folding_length(altitude, value) -> float:
    """Return the e-folding length [m]: minus one over the slope of the straight line through ln(value)."""
    return -1.0 / np.polyfit(altitude, np.log(value), 1)[0]


def jackknife(one: Strip, estimate) -> Measured:
    """Return `estimate(altitude, value)` of a strip, and its standard error with each replicate left out in turn."""
    groups = len(one.replicates)
    left = (one.replicates.sum(axis=0) - one.replicates) / (groups - 1)
    each = np.array([estimate(one.altitude, value) for value in left])
    spread = sqrt((groups - 1) / groups * float(((each - each.mean()) ** 2).sum()))
    return Measured(float(estimate(one.altitude, one.value)), spread)


class Ball(NamedTuple):
    """What Chamberlain's gas needs to know: `gm` [m3 s-2], `radius` [m], `mass` [kg] of an atom."""

    gm: float
    radius: float
    mass: float

    def jeans(self, kelvin: float) -> float:
        """Return the jeans parameter at the ground."""
        return self.gm * self.mass / (BOLTZMANN * kelvin * self.radius)

    def scale_height(self, kelvin: float) -> float:
        """Return kT/(m g) [m] with the gravity g at the ground."""
        return self.radius / self.jeans(kelvin)

    def columns(self, kelvin: float, altitude) -> np.ndarray:
        """Return Chamberlain's tangent columns (1963, Planet. Space Sci. 11, 901), in units of n_c R."""
        b = 1.0 + np.atleast_1d(altitude)[:, np.newaxis] / self.radius
        # Along z = w^2 even nodes see both the tangent point and the far end.
        density = density_ratio(self.jeans(kelvin), np.sqrt(b * b + NODES**4))
        return (density * 4.0 * NODES * WEIGHTS).sum(axis=1)

    def thermometer(self, altitude):
        """Return the function from e-folding lengths [m] of columns at these altitudes to Chamberlain's T [K].

        NaN beyond the longest: an escaping gas falls no more slowly than it spreads.
        """
        kelvins = self.gm * self.mass / (BOLTZMANN * self.radius) / np.geomspace(60.0, 0.05, 120)
        lengths = np.array([folding_length(altitude, self.columns(one, altitude)) for one in kelvins])
        rising = np.append(np.diff(lengths) > 0.0, False)
        last = len(rising) if rising[:-1].all() else int(np.argmin(rising)) + 1

        def kelvin(length: float) -> float:
            return float(np.interp(length, lengths[:last], kelvins[:last], np.nan, np.nan))

        return kelvin


class Found(NamedTuple):
    """What an observer finds in a strip: the e-folding length [km], and Chamberlain's temperature [K] with it."""

    length: Measured
    kelvin: Measured


def measure(ball: Ball, kelvin: float, published: float, strips: dict[str, Strip]) -> dict[str, Found]:
    """Print what is found in each strip over each of `RANGES`, and return what is found over `RANGE`.

    Parameters
    ----------
    ball : Ball
        The body and the gas.
    kelvin, published : float
        Temperature of the launch [K], and published e-folding length [m].
    strips : dict of str to Strip
        By their names.
    """
    rows, found = [], {}
    for low, high in RANGES:
        ends = low * published, high * published
        altitude = between(next(iter(strips.values())), *ends).altitude
        warmth = ball.thermometer(altitude)
        exact = folding_length(altitude, ball.columns(kelvin, altitude))
        where = f"{ends[0] / 1e3:.0f} to {ends[1] / 1e3:.0f} km"
        rows.append((where, "Chamberlain 1963", f"{exact / 1e3:.4g}", f"{warmth(exact):.4g}"))
        for name, one in strips.items():
            part = between(one, *ends)
            length = jackknife(part, lambda h, n: folding_length(h, n) / 1e3)
            heat = jackknife(part, lambda h, n, warmth=warmth: warmth(folding_length(h, n)))
            rows.append((where, name, length, heat))
            if (low, high) == RANGE:
                found[name] = Found(length, heat)
    heads = ("tangent altitudes", "what", "e-folding length [km]", "Chamberlain's temperature [K]")
    _print_rows(heads, rows)
    return found


def _print_rows(heads, rows) -> None:
    """Print a table in columns."""
    texts = [list(map(str, row)) for row in [heads, *rows]]
    widths = [max(map(len, column)) for column in zip(*texts, strict=True)]
    for row in texts:
        print(
            "  ".join(text.ljust(width) for text, width in zip(row, widths, strict=True)).rstrip(), flush=True
        )
