"""Progress on standard error: a bar on a terminal, plain lines elsewhere."""

import sys
from collections.abc import Iterator
from contextlib import contextmanager
from time import monotonic

from rich.console import Console
from rich.progress import BarColumn, Progress, TaskProgressColumn, TextColumn, TimeRemainingColumn

from tracer.engine.progress import Status, Watcher

SECONDS_BETWEEN_LINES = 5.0


@contextmanager
def shown_progress() -> Iterator[Watcher]:
    """Yield a watcher that shows a run's progress while the context lasts."""
    if not sys.stderr.isatty():
        yield _plain_lines()
        return
    columns = (TextColumn("tracing"), BarColumn(), TaskProgressColumn(), TextColumn("{task.description}"))
    with Progress(*columns, TimeRemainingColumn(), console=Console(stderr=True)) as bar:
        task = bar.add_task("compiling", total=None)
        begin: float | None = None

        def show(status: Status) -> None:
            nonlocal begin
            begin = begin or monotonic()
            text = _figures(status, monotonic() - begin)
            bar.update(task, completed=status.atoms, total=status.atoms_expected, description=text)

        yield show


def _plain_lines() -> Watcher:
    begin: float | None = None
    last = 0.0

    def show(status: Status) -> None:
        nonlocal begin, last
        now = monotonic()
        if begin is None:
            # Compiling is over when the first word comes: it says nothing about the rate.
            begin = last = now
            text = f"tracing {status.atoms_expected:,} particles on {status.workers} workers"
            print(text, file=sys.stderr, flush=True)
        if now - last < SECONDS_BETWEEN_LINES:
            return
        last = now
        share = status.atoms / status.atoms_expected
        left = f", about {(now - begin) * (1.0 - share) / share:.0f} s to go" if share > 0.0 else ""
        text = f"{_percent(100 * share)} %, {_figures(status, now - begin)}{left}"
        print(text, file=sys.stderr, flush=True)

    return show


def _percent(value: float) -> str:
    """Return a percentage in whole numbers, below ten with a digit more, so that slow work is seen to move."""
    return f"{value:.1f}" if value < 10.0 else f"{value:.0f}"


def _figures(status: Status, seconds: float) -> str:
    rate = status.flights / seconds if seconds > 0.0 else 0.0
    error = status.relative_error
    precision = "" if error is None else f", {status.known} known to {100 * error:.2g} %"
    part = f"{status.part}, " if status.part else ""
    return f"{part}{rate:,.0f} flights/s on {status.workers} workers{precision}"
