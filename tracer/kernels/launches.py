"""The launches of new atoms, as kernels take them."""

from typing import NamedTuple

import numpy as np


class Launches(NamedTuple):
    """New atoms: unit vectors `positions` (n, 3), `velocities` (n, 3) [m s-1], `weights` (n,) [s-1].

    Velocities are relative to the ground, along Sun-fixed axes; a weight is an atom's share of the release rate.
    """

    positions: np.ndarray
    velocities: np.ndarray
    weights: np.ndarray
