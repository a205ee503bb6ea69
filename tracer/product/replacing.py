"""A file that appears whole or not at all: written beside, synced, renamed, its folder synced."""

import os
import secrets
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

NAME_START = 40
"""Characters of the target's name kept in its temporary name, which must stay below 255 bytes."""


@contextmanager
def written_beside(target: Path) -> Iterator[Path]:
    """Yield a new name beside `target`; whatever stands there at the end of the context is removed."""
    beside = target.with_name(f".{target.name.lstrip('.')[:NAME_START]}.{secrets.token_hex(6)}.part")
    try:
        yield beside
    finally:
        with suppress(OSError):
            beside.unlink()


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
