"""What a release contributes to a profile: its points for one atom per second, by launch speed where that is known."""

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


class Response(NamedTuple):
    """Points of a profile by launch speed: B bins between `edges` [m s-1], for one atom per second, of `mass` [kg].

    `escape` is the escape speed [m s-1]; `means` (B, 2, N) for an even number of launches in a bin, order 0, and
    their slope across it, order 1; `replicates` (G, B, 2, N).
    """

    edges: Floats
    mass: float
    escape: float
    means: Floats
    replicates: Floats


class Source(NamedTuple):
    """One release as a profile of N points sees it.

    `rate` [s-1] of the product; `mean` (N,) and `replicates` (G, N) for one atom per second, in the unit of the points;
    `batches` (G,) that count into each replicate; `speed` is the run file's table of the law of launch speeds;
    `response` is None where the product holds none; `depth` (N,) is the optical depth at the line's centre for one atom
    per second, NaN where it is not known.
    """

    name: str
    product: str
    rate: float
    mean: Floats
    replicates: Floats
    batches: Floats
    speed: dict[str, Any]
    response: Response | None
    depth: Floats


def covariance(replicates: Floats, batches: Floats) -> Floats:
    """Return the covariance (N, N) of the mean over all batches of `replicates` (G, N).

    sum_i b_i (x_i - x)(x_i - x)^T / ((G - 1) B), x the mean over all B = sum b_i batches: a replicate of b batches
    varies as 1/b, see `tracer.observe.spread.standard_error`.
    """
    total = float(np.sum(batches))
    away = replicates - (batches @ replicates) / total
    return np.asarray((away.T * batches) @ away / ((len(batches) - 1) * total))
