"""What happens to a run: sentences for people on standard error, one JSON line an event for machines."""

import json
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from datetime import UTC, datetime

from tracer.engine.progress import Note
from tracer.errors import InputError


@contextmanager
def event_log(path: str | None) -> Iterator[Note]:
    """Yield what takes note of events, and appends them to the file `path` if there is one.

    A file that cannot be written any longer, as on a full disk, is given up with a word; the run goes on.

    Raises
    ------
    InputError
        The file cannot be opened.
    """
    if path is None:
        yield _say
        return
    try:
        file = open(path, "a", encoding="utf-8", buffering=1)  # noqa: SIM115
    except OSError as error:
        raise InputError(f"--log {path}: cannot be written: {error.strerror}") from None
    broken = False

    def note(event: str, text: str, **facts: float | str | None) -> None:
        nonlocal broken
        _say(event, text)
        if broken:
            return
        moment = datetime.now(UTC).isoformat(timespec="milliseconds")
        words = {"text": text} if text else {}
        try:
            file.write(json.dumps({"time": moment, "event": event, **words, **facts}) + "\n")
        except OSError as error:
            broken = True
            _say("log", f"--log {path}: is given up: {error.strerror}")

    try:
        yield note
    finally:
        try:
            file.close()
        except OSError as error:
            _say("log", f"--log {path}: is cut short: {error.strerror}")


def _say(event: str, text: str, **facts: float | str | None) -> None:
    del event, facts
    if text:
        print(text, file=sys.stderr, flush=True)
