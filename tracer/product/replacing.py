"""A file that appears whole or not at all: written beside, synced, renamed, its folder synced."""

import os
import re
import secrets
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

PART = ".part"
RANDOM_BYTES = 6
NAME_START = 40
"""Characters of the target's name kept in its temporary name, which must stay below 255 bytes."""


@contextmanager
def written_beside(target: Path) -> Iterator[Path]:
    """Yield a new name beside `target`; whatever stands there at the end of the context is removed."""
    beside = target.with_name(f"{_start(target)}{secrets.token_hex(RANDOM_BYTES)}{PART}")
    try:
        yield beside
    finally:
        with suppress(OSError):
            beside.unlink()


def remove_leftovers(target: Path) -> None:
    """Remove what killed writers of `target` have left beside it; whoever calls this holds the target's lock."""
    pattern = re.compile(re.escape(_start(target)) + f"[0-9a-f]{{{2 * RANDOM_BYTES}}}" + re.escape(PART))
    # A longer name shares its start with others, whose writers may be alive.
    if len(target.name.lstrip(".")) > NAME_START:
        return
    with suppress(OSError):
        for entry in target.parent.iterdir():
            if pattern.fullmatch(entry.name):
                entry.unlink()


def _start(target: Path) -> str:
    return f".{target.name.lstrip('.')[:NAME_START]}."


def put_in_place(beside: Path, target: Path) -> None:
    """Rename the synced file `beside` to `target`, and make sure that the folder remembers it."""
    os.replace(beside, target)
    sync_folder(target.parent)


def sync(path: Path) -> None:
    """Wait until the content of a file is on the disk."""
    with open(path, "r+b") as file:
        os.fsync(file.fileno())


def sync_folder(folder: Path) -> None:
    """Wait until the names in a folder are on the disk."""
    # Not every system can open or sync a folder; the rename stands all the same.
    with suppress(OSError):
        descriptor = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)
