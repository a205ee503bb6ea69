"""Ctrl-C between two foldings, never within one: the first is noted, the second acts at once."""

import signal
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from types import FrameType
from typing import Any


@contextmanager
def deferred_interrupts() -> Iterator[Callable[[], bool]]:
    """Yield a function that says whether Ctrl-C was pressed, or the process was asked to end (SIGTERM).

    A second such signal raises KeyboardInterrupt wherever the program stands. Handlers that somebody else has
    installed, and threads that are not the main one, are left alone: there the function always says False.
    """
    if threading.current_thread() is not threading.main_thread():
        yield lambda: False
        return
    asked = False

    def note(_signal: int, _frame: FrameType | None) -> None:
        nonlocal asked
        if asked:
            raise KeyboardInterrupt
        asked = True

    before: dict[signal.Signals, Any] = {}
    taken = {signal.SIGINT: signal.default_int_handler, signal.SIGTERM: signal.SIG_DFL}
    for number, default in taken.items():
        if signal.getsignal(number) is default:
            before[number] = signal.signal(number, note)
    try:
        yield lambda: asked
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)
