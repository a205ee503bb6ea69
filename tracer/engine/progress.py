"""What a run tells about itself while it works."""

from threading import Lock
from typing import NamedTuple, Protocol


class Status(NamedTuple):
    """How far a run has come.

    `atoms` of `atoms_expected` have been followed to their end, on `flights` launches; `batches` of
    `batches_expected` are folded; `relative_error` is that of the mean content of the grid, None before two batches.
    """

    atoms: int
    atoms_expected: int
    flights: int
    batches: int
    batches_expected: int
    relative_error: float | None
    workers: int


class Watcher(Protocol):
    """Whoever wants to know: called now and then, always from the thread that called `run`."""

    def __call__(self, status: Status) -> None:
        """Take note of `status`."""
        ...


class Counter:
    """Atoms and flights so far, added up over the workers' threads."""

    def __init__(self) -> None:
        self._lock = Lock()
        self.atoms = 0
        self.flights = 0

    def add(self, atoms: int, flights: int) -> None:
        """Count what a slice has finished."""
        with self._lock:
            self.atoms += atoms
            self.flights += flights
