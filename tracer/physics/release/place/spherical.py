"""Points on the unit sphere."""

import numpy as np

from tracer.physics.release.laws import Floats


def around_axis(axis: tuple[float, float, float], cosine: Floats, turn: Floats) -> Floats:
    """Return unit vectors, (n, 3), at angle acos(`cosine`) from unit vector `axis`, at `turn` (0..1) about it."""
    n = np.array(axis)
    # The coordinate axis least aligned with n gives a cross product far from zero.
    first = np.cross(n, np.eye(3)[np.argmin(np.abs(n))])
    first /= np.linalg.norm(first)
    second = np.cross(n, first)
    sine = np.sqrt(np.maximum(0.0, 1.0 - cosine * cosine))
    azimuth = 2.0 * np.pi * turn
    along, across = sine * np.cos(azimuth), sine * np.sin(azimuth)
    places = np.empty((len(cosine), 3))
    for k in range(3):
        places[:, k] = cosine * n[k] + along * first[k] + across * second[k]
    return places
