"""What `run.py` asks, by those ends of ranges alone that lie on the truth's side and near it: several times faster."""

import sys
import time
from collections.abc import Iterator
from typing import NamedTuple

import numpy as np
from run import BANDS, CASES, DRAWS, MODEL, RUN_FILE, SEED, TRUE, TRUTH, Case, case_of, measured

import tracer
from tracer.observe.fit.calibration import due
from tracer.observe.fit.fitting import settled
from tracer.observe.fit.likelihood import Likelihood, slots_of
from tracer.observe.fit.ranges import RISE_68, RISE_95, BetterFound, Scan, end_of, rise_at, scan_of

WILKS = (RISE_68, RISE_95)
NEAR = ((0.3, 2.2), (1.8, 8.0))
"""Rises at the truth within which the end is asked for: beyond, ranges of 68 or 95 % hold it, or do not, for sure."""


class Answer(NamedTuple):
    """Of one draw: which ranges hold the truth (2, P), of 68 and 95 %, rises at their ends, NaN where not asked for.

    `depths` are the rates over their errors, of the covariance.
    """

    held: np.ndarray
    rises: np.ndarray
    depths: np.ndarray


def answer(likelihood: Likelihood) -> Answer:
    """Return what a fit says of the truth."""
    known: tuple[np.ndarray, ...] = ()
    while True:
        scan = scan_of(likelihood, settled(likelihood, known))
        try:
            return asked(scan)
        except BetterFound as found:
            known = (found.parameters,)


def asked(scan: Scan) -> Answer:
    """Return whether ranges hold the truth, by their ends on its side.

    Raises
    ------
    BetterFound
        As `end_of`.
    """
    slots = scan.likelihood.slots
    true = [TRUE[s.name] / s.unit if s.key is None else np.log(TRUE[s.name]) for s in slots]
    held, rises = np.zeros((2, len(slots)), bool), np.full((2, len(slots)), np.nan)
    for number, place in enumerate(true):
        rise, sign = rise_at(scan, {number: place}), 1.0 if place > scan.best[number] else -1.0
        for level, (low, high) in enumerate(NEAR):
            # Another valley behind the truth has it in the range, however high the hill.
            behind = any(
                sign * (one.parameters[number] - place) > 0.0
                for one in scan.valleys[1:]
                if one.value - scan.value < high
            )
            held[level, number] = rise < low
            if low <= rise and (rise <= high or behind):
                end = end_of(scan, number, WILKS[level], sign)
                rises[level, number] = due(scan, number, end, WILKS[level])
                end = end_of(scan, number, rises[level, number], sign)
                held[level, number] = sign * (end.place - place) >= 0.0
    # A range of 95 % holds that of 68.
    held[1] |= held[0]
    free = [n for n, slot in enumerate(slots) if slot.key is None]
    return Answer(held, rises, scan.best[free] / np.sqrt(np.diag(scan.covariance)[free]))


def likelihoods(case: Case, draws: int) -> Iterator[Likelihood]:
    """Yield -2 ln L of the profiles that `run.py` draws."""
    rng = np.random.default_rng(SEED)
    for _ in range(draws):
        data = measured(case, case.truth + case.sigma * rng.normal(size=len(case.truth)))
        yield Likelihood(data, case.components, slots_of(data, case.components, False))


def main(draws: int, numbers: list[int]) -> int:
    """Print how often ranges hold the truth, and return 0 where all of them do as often as they say."""
    model, truth = (tracer.run(tracer.load_run(RUN_FILE, list(settings))) for settings in (MODEL, TRUTH))
    fine = True
    for releases, factor in (CASES[number] for number in numbers):
        case, begin = case_of(model, truth, releases), time.process_time()
        case = case._replace(sigma=factor * case.sigma)
        found = [answer(one) for one in likelihoods(case, draws)]
        fine &= report(case, factor, found)
        print(f"  {(time.process_time() - begin) / draws:.2f} s of one core a draw", flush=True)
    return 0 if fine else 1


def report(case: Case, factor: float, found: list[Answer]) -> bool:
    """Print the rows of a case, and return whether all its shares are as wanted."""
    names = [slot.name for slot in next(likelihoods(case, 1)).slots]
    shares = np.mean([one.held for one in found], axis=0)
    rises = np.nanmedian([one.rises for one in found], axis=0)
    depths = np.nanmedian([one.depths for one in found], axis=0)
    fine = True
    print(f"noise {factor:g}, {len(found)} draws")
    for n, name in enumerate(names):
        good = all(low <= share <= high for (low, high), share in zip(BANDS, shares[:, n], strict=True))
        fine &= good
        depth = f"{depths[n]:8.1f}" if n < len(depths) else 8 * " "
        print(
            f"  {name:30s} {shares[0, n]:8.4f} {shares[1, n]:8.4f}   {rises[0, n]:5.2f} {rises[1, n]:5.2f}   {depth} "
            f"{'' if good else 'FAILS'}"
        )
    return fine


if __name__ == "__main__":
    given = [int(word) for word in sys.argv[1:]]
    sys.exit(main(given[0] if given else DRAWS, given[1:] or list(range(len(CASES)))))
