"""Unbiased roulette: who has lost nearly all of its weight ends, or goes on with more.

Kahn & Harris 1951, Natl. Bur. Stand. Appl. Math. Ser. 12, 27 (memory).
"""

from typing import NamedTuple

from tracer.kernels.compiling import merged


class Roulette(NamedTuple):
    """Below which survival roulette is played, `on_ground` before a launch and `aloft` within a flight; 0 is never.

    Whoever goes on does so with `gain` times that survival, so that it is not asked again at once.
    """

    on_ground: float
    aloft: float
    gain: float


WEIGHTED = Roulette(on_ground=0.1, aloft=0.01, gain=2.0)
"""The roulette of all runs.

An atom of survival w adds w to a sum, at the price of a whole atom. Where it bounces that is better spent on new atoms:
in cells the figure of merit rises as the threshold on the ground does, while that of the mean life, which weights know
exactly, falls; at 0.1 no figure is worse than without roulette. Aloft the far end of a tail holds nothing but atoms of
small survival: below a threshold of 0.01 its pixels lose nothing, at 0.1 they lose a third. Measured in
`analysis/validation/roulette/`.
"""

OFF = Roulette(on_ground=0.0, aloft=0.0, gain=2.0)
"""All weights are carried to the end, however small."""

ANALOG = Roulette(on_ground=1.0, aloft=0.0, gain=1.0)
"""Each landing decides whether the whole atom was lost: weights in flight alone."""


@merged
def play_roulette(gain, tally, weight, survival, least, rng):
    """Return the survival with which an atom goes on, 0 where it does not.

    `weight` [s-1] times `survival` is what is alive of it; nothing happens where `survival` is at least `least`. Below,
    it goes on as `gain` times `least` so often that the mean stays the same, and the difference is booked.
    """
    if survival >= least:
        return survival
    raised = gain * least
    if rng.random() * raised < survival:
        tally.roulette[0] += weight * (raised - survival)
        return raised
    tally.roulette[0] -= weight * survival
    return 0.0
