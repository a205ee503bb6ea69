"""From brightness to counts, signal-to-noise ratio and exposure.

S signal, B everything else in the same band (background, scattered sunlight, dark), both in counts per second; t
exposure; V = n R^2 the variance of n reads of noise R. Counts are Poisson.
"""

import math

import numpy as np
from numpy.typing import NDArray

from tracer.constants import RAYLEIGH

Floats = NDArray[np.float64]


def count_rate(brightness: Floats, area: float, solid_angle: float, throughput: float) -> Floats:
    """Return the counts per second that light of a line makes.

    Parameters
    ----------
    brightness : ndarray
        4 pi I in rayleigh, mean over the field of view.
    area, solid_angle, throughput : float
        Collecting area [m2], field of view [sr], counts per photon.

    Returns
    -------
    ndarray
        brightness x 1e10/(4 pi) x area x solid angle x throughput [s-1].
    """
    return np.asarray(brightness * RAYLEIGH / (4.0 * math.pi) * area * solid_angle * throughput)


def signal_to_noise(signal: Floats, other: Floats, exposure: float | Floats, read_variance: float) -> Floats:
    """Return S t / sqrt((S + B) t + V); 0 without any counts."""
    variance = (signal + other) * exposure + read_variance
    return np.asarray(
        np.divide(signal * exposure, np.sqrt(variance), out=np.zeros_like(signal), where=variance > 0.0)
    )


def signal_to_noise_error(
    signal: Floats, signal_error: Floats, other: Floats, exposure: float, read_variance: float
) -> Floats:
    """Return the standard error that `signal_error` [s-1], from the Monte Carlo, gives the ratio: d(SNR)/dS times it.

    d(SNR)/dS = t (V' - S t/2) / V'^(3/2), V' = (S + B) t + V.
    """
    variance = (signal + other) * exposure + read_variance
    slope = np.divide(
        exposure * (variance - 0.5 * signal * exposure),
        variance**1.5,
        out=np.zeros_like(signal),
        where=variance > 0.0,
    )
    return np.asarray(slope * signal_error)


def exposure_for(ratio: float, signal: Floats, other: Floats, read_variance: float) -> Floats:
    """Return the exposure [s] with which the signal-to-noise ratio becomes `ratio`; infinite without signal.

    S^2 t^2 = ratio^2 [(S + B) t + V], solved for t > 0.
    """
    square = ratio * ratio
    half = 0.5 * square * (signal + other)
    with np.errstate(over="ignore"):
        numerator = half + np.sqrt(half * half + square * signal**2 * read_variance)
        return np.asarray(
            np.divide(numerator, signal**2, out=np.full_like(signal, np.inf), where=signal**2 > 0.0)
        )
