"""Where on its orbit a body stands, from its distance to the Sun."""

import math

import numpy as np

from tracer.observe.gas import Gas
from tracer.observe.sights import Floats


def true_anomalies(gas: Gas, distances: Floats | None, count: int) -> Floats:
    """Return `count` true anomalies [deg].

    Parameters
    ----------
    gas : Gas
        Of a product: its own holds for the whole path where the path does not tell the distance.
    distances : ndarray, shape (count,), optional
        Of the body from the Sun [m], in the order of time: cos f = (a (1 - e^2)/d - 1)/e, outbound where they grow.

    Returns
    -------
    ndarray, shape (count,)
        In [0, 360); NaN where neither orbit nor true anomaly is known, or the orbit never reaches the distance.
    """
    orbit = gas.facts.orbit
    if distances is None and gas.true_anomaly is not None:
        return np.full(count, gas.true_anomaly % 360.0)
    if distances is None and gas.sun_distance is not None:
        distances = np.full(count, gas.sun_distance)
    if orbit is None or distances is None or orbit.eccentricity == 0.0:
        return np.full(count, math.nan)
    a, e = orbit.semi_major_axis, orbit.eccentricity
    cosine = (a * (1.0 - e * e) / distances - 1.0) / e
    angle = np.degrees(np.arccos(np.where(np.abs(cosine) <= 1.0 + 1e-9, np.clip(cosine, -1.0, 1.0), np.nan)))
    outbound = np.full(len(distances), gas.sun_radial_velocity >= 0.0)
    # A distance that stays the same but for rounding says nothing about the sense.
    if len(distances) > 1 and np.ptp(distances) > 1e-9 * np.max(distances):
        outbound = np.gradient(distances) >= 0.0
    return np.asarray(np.where(outbound, angle, (360.0 - angle) % 360.0))
