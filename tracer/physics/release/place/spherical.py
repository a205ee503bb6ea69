"""Points on the unit sphere."""

import numpy as np

from tracer.kernels.places import places_around
from tracer.physics.release.laws import Floats


def around_axis(axis: tuple[float, float, float], cosine: Floats, turn: Floats) -> Floats:
    """Return unit vectors, (n, 3), at angle acos(`cosine`) from unit vector `axis`, at `turn` (0..1) about it."""
    n = np.array(axis)
    # The coordinate axis least aligned with n gives a cross product far from zero.
    first = np.cross(n, np.eye(3)[np.argmin(np.abs(n))])
    first /= np.linalg.norm(first)
    axes = np.stack([n, first, np.cross(n, first)])
    return np.asarray(places_around(axes, cosine, np.ascontiguousarray(turn)))
