"""What lies along lines of sight through the gas of a product, with errors from its replicates."""

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.kernels.rays import Sums, integrate
from tracer.observe.gas import Gas
from tracer.observe.sights import Sights, paths_of

Floats = NDArray[np.float64]

BLOCK = 4096
"""Lines of sight at a time, which bounds the memory for their replicates."""


class Integrals(NamedTuple):
    """What lies along N lines of sight, R releases, L lines, G replicates.

    `column` and `column_lit` (N, R) [m-2], the latter outside the umbra; `photons` (N, L, R) [m-2 s-1], the integral of
    the emission rate; `beyond` (N,) [m-2] an estimate of the column above the grid's top, which the others leave out;
    `column_replicates` (N, R, G) and `photon_replicates` (N, L, R, G).
    """

    column: Floats
    column_lit: Floats
    photons: Floats
    beyond: Floats
    column_replicates: Floats
    photon_replicates: Floats


def integrals_along(gas: Gas, sights: Sights) -> Integrals:
    """Return what lies along `sights`, all replicates at once: for few lines of sight, see `blocks`."""
    paths, _ = paths_of(sights, gas.radius)
    count, releases, lines = len(paths.start), len(gas.releases), len(gas.lines)
    quantities, groups = gas.contents.replicates.shape[1:]
    sums = Sums(
        np.zeros((count, quantities)),
        np.zeros((count, releases)),
        np.zeros((count, quantities, groups)),
        np.zeros(count),
    )
    integrate(gas.cells, gas.shadow, gas.contents, paths, sums)
    return Integrals(
        column=sums.all[:, :releases],
        column_lit=sums.lit,
        photons=sums.all[:, releases:].reshape(count, lines, releases),
        beyond=sums.beyond,
        column_replicates=sums.replicates[:, :releases],
        photon_replicates=sums.replicates[:, releases:].reshape(count, lines, releases, groups),
    )


def blocks(sights: Sights) -> Iterator[tuple[slice, Sights]]:
    """Yield the sights a block at a time, each with its place."""
    for first in range(0, len(sights.start), BLOCK):
        place = slice(first, first + BLOCK)
        yield place, Sights(sights.start[place], sights.look[place])
