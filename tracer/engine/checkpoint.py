"""One checkpoint file: a header in JSON, then the accumulators as plain numbers, each behind its checksum.

Nothing in it is executed or unpickled. Its size follows from the header and the run, and is compared with the file's
before the numbers are read.
"""

import hashlib
import json
import os
from collections.abc import Sequence
from io import BufferedReader
from pathlib import Path
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.engine.fingerprint import Fingerprint, difference
from tracer.errors import TracerError
from tracer.product.replacing import put_in_place, written_beside

MAGIC = b"\x89tracer\n"
FORMAT = 1
DIGEST = hashlib.sha256().digest_size
LENGTH_BYTES = 4
MOST_HEADER_BYTES = 65_536
MOST_COUNT = 2**63 - 1
PIECE = 2**22
"""Bytes read at a time while the checksum is taken."""
NUMBER = np.dtype("<f8")


class DamagedCheckpoint(TracerError):
    """A checkpoint that is not what was written."""


class Identity(NamedTuple):
    """What must agree for a checkpoint to go on to the same last bit."""

    run_hash: str
    first_batch: int
    replicates: int
    stop: str
    """The run file's stop rule as JSON, empty without one."""
    fingerprint: Fingerprint


class Progress(NamedTuple):
    """How far the run had come: tasks `folded`, and their costs over all sessions.

    `serial` counts the checkpoints of a run, `region` values follow the accumulators.
    """

    serial: int
    folded: int
    region: int
    flights: int
    steps: int
    kernel_seconds: float
    wall_seconds: float


class Header(NamedTuple):
    """All that a checkpoint says about itself."""

    identity: Identity
    progress: Progress
    size: int
    """Bytes of the header with its frame: where the numbers begin."""


def write_checkpoint(
    path: Path, identity: Identity, progress: Progress, arrays: Sequence[NDArray[np.float64]]
) -> None:
    """Replace the checkpoint at `path` atomically.

    Raises
    ------
    OSError
        Where the folder or the disk fails; what stood at `path` is still whole.
    """
    content = json.dumps({"format": FORMAT, **_plain(identity), **progress._asdict()}).encode()
    head = MAGIC + len(content).to_bytes(LENGTH_BYTES, "little") + content
    digest = hashlib.sha256()
    with written_beside(path) as beside:
        with open(beside, "xb") as file:
            file.write(head + hashlib.sha256(head).digest())
            for array in filter(np.size, arrays):
                numbers = np.ascontiguousarray(array, NUMBER).data.cast("B")
                digest.update(numbers)
                file.write(numbers)
            file.write(digest.digest())
            file.flush()
            os.fsync(file.fileno())
        put_in_place(beside, path)


def read_header(path: Path) -> Header:
    """Return the header of the checkpoint at `path`; the numbers are not looked at.

    Raises
    ------
    DamagedCheckpoint
        Where it is cut short, changed, or no checkpoint.
    OSError
        Where it cannot be read.
    """
    if not path.is_file():
        raise DamagedCheckpoint("is no plain file")
    with open(path, "rb") as file:
        frame = file.read(len(MAGIC) + LENGTH_BYTES)
        if frame[: len(MAGIC)] != MAGIC or len(frame) < len(MAGIC) + LENGTH_BYTES:
            raise DamagedCheckpoint("is no checkpoint of this program")
        length = int.from_bytes(frame[len(MAGIC) :], "little")
        if length > MOST_HEADER_BYTES:
            raise DamagedCheckpoint("its header is damaged")
        content, checksum = file.read(length), file.read(DIGEST)
    if hashlib.sha256(frame + content).digest() != checksum:
        raise DamagedCheckpoint("its header is damaged")
    return _header(content, len(frame) + length + DIGEST)


def check_numbers(path: Path, header: Header, count: int) -> None:
    """Make sure that exactly `count` numbers follow the header and are those that were written.

    The file's size is looked at first, and no more than a piece of it is held.

    Raises
    ------
    DamagedCheckpoint
        Where they are not.
    """
    size = count * NUMBER.itemsize
    with open(path, "rb") as file:
        if os.fstat(file.fileno()).st_size != header.size + size + DIGEST:
            raise DamagedCheckpoint("is not as long as it should be")
        file.seek(header.size)
        digest = hashlib.sha256()
        while size and (piece := file.read(min(PIECE, size))):
            digest.update(piece)
            size -= len(piece)
        if size or file.read() != digest.digest():
            raise DamagedCheckpoint("its numbers are damaged")


def read_numbers(path: Path, header: Header, arrays: Sequence[NDArray[np.float64]]) -> None:
    """Fill the contiguous `arrays`, in the order in which they were written."""
    with open(path, "rb") as file:
        file.seek(header.size)
        for array in filter(np.size, arrays):
            _fill(file, array)


def why_not_ours(theirs: Identity, ours: Identity) -> str:
    """Return in words why a checkpoint cannot be gone on from, empty where it can."""
    if theirs.run_hash != ours.run_hash:
        return "belongs to another run: another scene, seed or number of particles per batch"
    if changed := difference(theirs.fingerprint, ours.fingerprint):
        return f"was made by {changed}; the same last bits are not to be had"
    if theirs.first_batch != ours.first_batch:
        return f"begins with batch {theirs.first_batch} where this run begins with {ours.first_batch}"
    if theirs.replicates != ours.replicates:
        return f"keeps {theirs.replicates} replicates where this run keeps {ours.replicates}"
    if theirs.stop != ours.stop:
        return "was made with another ensemble.stop"
    return ""


def _fill(file: BufferedReader, array: NDArray[np.float64]) -> None:
    if file.readinto(array.reshape(-1).data.cast("B")) != array.nbytes:
        raise DamagedCheckpoint("is not as long as it should be")
    if array.dtype != NUMBER:
        array.byteswap(inplace=True)


def _plain(identity: Identity) -> dict[str, object]:
    return {**identity._asdict(), "fingerprint": identity.fingerprint._asdict()}


def _header(content: bytes, size: int) -> Header:
    """Return the header, every value checked for its type and range: a checksum is no proof of good will."""
    try:
        given = json.loads(content)
        if given.pop("format") != FORMAT:
            raise DamagedCheckpoint("is of a format that this package does not know")
        marks = {name: _text(given["fingerprint"][name]) for name in Fingerprint._fields}
        identity = Identity(
            _text(given["run_hash"]),
            _count(given["first_batch"]),
            _count(given["replicates"]),
            _text(given["stop"]),
            Fingerprint(**marks),
        )
        progress = Progress(
            serial=_count(given["serial"]),
            folded=_count(given["folded"]),
            region=_count(given["region"]),
            flights=_count(given["flights"]),
            steps=_count(given["steps"]),
            kernel_seconds=_seconds(given["kernel_seconds"]),
            wall_seconds=_seconds(given["wall_seconds"]),
        )
    except (ValueError, KeyError, TypeError, AttributeError, RecursionError):
        raise DamagedCheckpoint("its header is damaged") from None
    return Header(identity, progress, size)


def _text(value: object) -> str:
    if not isinstance(value, str):
        raise TypeError
    return value


def _count(value: object) -> int:
    if not isinstance(value, int) or isinstance(value, bool) or not 0 <= value <= MOST_COUNT:
        raise ValueError
    return value


def _seconds(value: object) -> float:
    if not isinstance(value, float) or not 0.0 <= value < float("inf"):
        raise ValueError
    return value
