"""The tasks of a run in the order in which they are folded: batch by batch, in each the releases in their order."""

from collections.abc import Sequence
from typing import NamedTuple, overload

from tracer.engine.batches import Task
from tracer.errors import InputError


class BatchRange(NamedTuple):
    """Batches `first` to `stop` - 1 of a run."""

    first: int
    stop: int

    @property
    def batches(self) -> int:
        """Number of batches."""
        return self.stop - self.first


def parse_batches(text: str) -> BatchRange:
    """Return the range that `text` names as FIRST:STOP, counted from 0, STOP left out of it.

    Raises
    ------
    InputError
        What is no such range, or one without a batch.
    """
    first, colon, stop = text.partition(":")
    if not (colon and first.isascii() and first.isdigit() and stop.isascii() and stop.isdigit()):
        raise InputError(
            f'--batches: "{text}" is no range; write for example 20:40 for the batches 20 to 39, counted from 0'
        )
    # SeedSequence takes spawn keys of any size, files and memory do not.
    if max(len(first), len(stop)) > MOST_DIGITS:
        raise InputError(f'--batches: "{text}" is out of range; at most {MOST_DIGITS} digits')
    if not int(first) < int(stop):
        raise InputError(f'--batches: "{text}" holds no batch; the first must be below the second')
    return BatchRange(int(first), int(stop))


MOST_DIGITS = 15


class Tasks(Sequence[Task]):
    """The tasks of a range of batches behind the first `done`, made when they are asked for: there may be millions."""

    def __init__(self, batches: BatchRange, releases: int, done: int = 0) -> None:
        self.batches = batches
        self.releases = releases
        self._done = done

    def __len__(self) -> int:
        """Return the number of tasks."""
        return self.batches.batches * self.releases - self._done

    @overload
    def __getitem__(self, place: int) -> Task: ...

    @overload
    def __getitem__(self, place: slice) -> list[Task]: ...

    def __getitem__(self, place: int | slice) -> Task | list[Task]:
        """Return the task that is folded at `place`, from 0."""
        if isinstance(place, slice):
            return [self[i] for i in range(*place.indices(len(self)))]
        if not 0 <= place < len(self):
            raise IndexError(place)
        batch, release = divmod(self._done + place, self.releases)
        return Task(release, self.batches.first + batch)

    def behind(self, done: int) -> "Tasks":
        """Return the tasks behind the first `done`."""
        return Tasks(self.batches, self.releases, self._done + done)
