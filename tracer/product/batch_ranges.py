"""Which batches of which seeds a product holds, as the attribute `batch_ranges` says it."""

import re
from collections.abc import Iterable
from typing import NamedTuple

_RANGE = re.compile(r"seed ([0-9]{1,19}) batches ([0-9]{1,19}):([0-9]{1,19})")
_BETWEEN = "; "


class SeedRange(NamedTuple):
    """Batches `first` to `stop` - 1 of the run with `seed`."""

    seed: int
    first: int
    stop: int

    def __str__(self) -> str:
        """Return the range as the attribute has it."""
        return f"seed {self.seed} batches {self.first}:{self.stop}"


def ranges_text(ranges: Iterable[tuple[int, int, int]]) -> str:
    """Return (seed, first, stop) ranges as text, sorted, those that meet put together."""
    joined: list[SeedRange] = []
    for one in sorted(map(SeedRange._make, ranges)):
        if joined and joined[-1].seed == one.seed and joined[-1].stop == one.first:
            joined[-1] = joined[-1]._replace(stop=one.stop)
        else:
            joined.append(one)
    return _BETWEEN.join(map(str, joined))


def parse_ranges(text: str) -> list[SeedRange]:
    """Return the ranges that `ranges_text` wrote.

    Raises
    ------
    ValueError
        For any other text.
    """
    found = []
    for part in text.split(_BETWEEN):
        match = _RANGE.fullmatch(part)
        if match is None or not int(match[2]) < int(match[3]):
            raise ValueError(f"{part!r} names no batches")
        found.append(SeedRange(*map(int, match.groups())))
    return found
