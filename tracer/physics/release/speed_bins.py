"""Bins of launch speed: fine where the atoms of a run are and about escape, where responses change most."""

import numpy as np

from tracer.physics.release.laws import Floats

FASTEST_IN_ESCAPES = 20.0
FASTEST_IN_MEDIANS = 40.0
"""How far bins reach: this many escape speeds, and this many median speeds of the slowest law."""

BELOW_ESCAPE = 24.0 / 32.0
"""Part of the bins that lies below the escape speed where that is well above the median speed."""

FEW_MEDIANS = 0.25
"""Escape speed in median speeds at which half as many bins lie below it: slower than that few atoms are."""

ENERGY, ENERGY_MEDIANS = 16.0, 5.0
BULK, BULK_MEDIANS = 6.0, 2.0
EDGE, EDGE_ESCAPES = 1.0, 0.05
"""Bins below escape stand as ENERGY bins even in log(1 + (v/a)^2), so that a Maxwellian falls evenly from bin to bin,
BULK bins even in log(1 + v/b) and EDGE bins even in log(1 + (v_esc - v)/c); a, b and c are these parts of the median
and the escape speed. Above, they are even in log(1 + (v - v_esc)/c). With 32 bins for sodium of 1,200 K, the mean
time in any shell up to 16 radii, told by straight lines of law and response alone, is wrong by at most 4 % over
Mercury, 0.8 % over a body of 3.2 km/s and 0.05 % over the Moon for a law of 600 K, by 0.3 % for 1,200 K, 0.05 % for
2,400 K and sputtered atoms (own quadrature)."""

GRID_POINTS = 4001


def speed_bin_edges(bins: int, escape_speed: float, slow: float, fast: float) -> Floats:
    """Return the edges (bins + 1,) [m s-1] of bins of launch speed, from 0, one of them exactly `escape_speed`.

    Parameters
    ----------
    bins : int
        Number of bins, at least 2.
    escape_speed : float
        Speed of escape from the ground [m s-1]; 0 without gravity.
    slow : float
        Median launch speed of the slowest law [m s-1].
    fast : float
        Speed [m s-1] that the bins reach at least.
    """
    top = max(FASTEST_IN_ESCAPES * escape_speed, FASTEST_IN_MEDIANS * slow, fast)
    scale = EDGE_ESCAPES * max(escape_speed, slow)
    if escape_speed == 0.0:
        return _above(0.0, top, scale, bins)
    part = BELOW_ESCAPE * escape_speed / (escape_speed + FEW_MEDIANS * slow)
    below = min(bins - 1, max(1, round(part * bins)))
    return np.concatenate(
        [_below(escape_speed, slow, below)[:-1], _above(escape_speed, top, scale, bins - below)]
    )


def _below(escape_speed: float, slow: float, bins: int) -> Floats:
    v = np.linspace(0.0, escape_speed, GRID_POINTS)
    energy = np.log1p((v / (ENERGY_MEDIANS * slow)) ** 2)
    bulk = np.log1p(v / (BULK_MEDIANS * slow))
    near = -np.log1p((escape_speed - v) / (EDGE_ESCAPES * escape_speed))
    place = ENERGY * energy / energy[-1] + BULK * bulk / bulk[-1] + EDGE * (1.0 - near / near[0])
    edges = np.asarray(np.interp(np.linspace(0.0, place[-1], bins + 1), place, v))
    edges[0], edges[-1] = 0.0, escape_speed
    return edges


def _above(escape_speed: float, top: float, scale: float, bins: int) -> Floats:
    whole = np.log1p((top - escape_speed) / scale)
    edges = escape_speed + scale * np.expm1(whole * np.arange(bins + 1) / bins)
    edges[0], edges[-1] = escape_speed, top
    return np.asarray(edges)
