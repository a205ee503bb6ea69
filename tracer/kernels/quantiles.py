"""A distribution of speeds as a table of its quantiles, for kernels that draw from any law."""

import math

import numpy as np

from tracer.kernels.compiling import kernel

NODES = 8192
"""Steps of a table: between two of them the speed is taken as linear, good to a millionth."""

LARGEST = 36.0
"""-ln(1 - u) of the last quantile: 1 - u is the rounding of a double."""


def quantile_nodes() -> np.ndarray:
    """Return the even numbers u, (NODES + 1,), whose quantiles make a table.

    They are even in the fourth root of -ln(1 - u): there a Maxwellian is nearly straight, at both ends.
    """
    root = np.arange(NODES + 1) / NODES
    return -np.expm1(-LARGEST * root**4)


@kernel
def drawn_quantile(rng, table):
    """Draw a value from the distribution whose quantiles at `quantile_nodes` are `table` (NODES + 1,)."""
    depth = min(LARGEST, -math.log(1.0 - rng.random()))
    place = math.sqrt(math.sqrt(depth / LARGEST)) * (table.shape[0] - 1)
    node = min(int(place), table.shape[0] - 2)
    return table[node] + (place - node) * (table[node + 1] - table[node])
