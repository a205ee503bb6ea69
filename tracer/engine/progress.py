"""What a run tells about itself while it works."""

from threading import Lock
from typing import NamedTuple, Protocol


class Status(NamedTuple):
    """How far a run has come.

    `atoms` of `atoms_expected` have been followed, those under way in part, on `flights` launches; `batches` of
    `batches_expected` are folded; `relative_error` is None before two batches.
    """

    atoms: float
    atoms_expected: int
    flights: int
    batches: int
    batches_expected: int
    relative_error: float | None
    known: str
    """What the relative error is one of, in words."""
    workers: int
    part: str = ""
    """Which part of a larger job is under way, in words; empty where the run is all."""


class Watcher(Protocol):
    """Whoever wants to know: called now and then, always from the thread that called `run`."""

    def __call__(self, status: Status) -> None:
        """Take note of `status`."""
        ...


class Note(Protocol):
    """Whoever keeps a record of what happens to a run, always called from the thread that called `run`."""

    def __call__(self, event: str, text: str, **facts: float | str | None) -> None:
        """Take note of `event` with its `facts`; `text` is the sentence for people, empty where they need none."""
        ...


def no_note(event: str, text: str, **facts: float | str | None) -> None:
    """Take no note."""


class Counter:
    """Atoms and flights so far, added up over the workers' threads."""

    def __init__(self, atoms: float = 0.0, flights: int = 0) -> None:
        self._lock = Lock()
        self.atoms = atoms
        self.flights = flights

    def add(self, atoms: float, flights: int) -> None:
        """Count what a slice has finished."""
        with self._lock:
            self.atoms += atoms
            self.flights += flights
