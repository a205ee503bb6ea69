"""Ranges of allowed numbers, with the words for them."""

from typing import NamedTuple


class Interval(NamedTuple):
    """Numbers between two ends, each taken in (`at_least`, `at_most`) or left out (`above`, `below`)."""

    above: float | None = None
    at_least: float | None = None
    below: float | None = None
    at_most: float | None = None

    def holds(self, number: float) -> bool:
        """Whether `number` lies inside."""
        return (
            (self.above is None or number > self.above)
            and (self.at_least is None or number >= self.at_least)
            and (self.below is None or number < self.below)
            and (self.at_most is None or number <= self.at_most)
        )

    def words(self, unit: str = "") -> str:
        """The range in words, for example `at least 0 and below 24`; empty where there are no ends."""
        ends = {
            name.replace("_", " "): f"{end:.15g} {unit}".rstrip()
            for name, end in self._asdict().items()
            if end is not None
        }
        if ends.keys() == {"at least", "at most"}:
            return f"from {ends['at least']} to {ends['at most']}"
        return " and ".join(f"{side} {end}" for side, end in ends.items())


EVERYTHING = Interval()
