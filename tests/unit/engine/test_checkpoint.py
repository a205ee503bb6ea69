"""One checkpoint file: what was written comes back, and nothing else is taken for it."""

import hashlib
import json
import os
import random

import numpy as np
import pytest

from tracer.engine import checkpoint
from tracer.engine.checkpoint import (
    DamagedCheckpoint,
    Identity,
    Progress,
    check_numbers,
    read_header,
    read_numbers,
    why_not_ours,
    write_checkpoint,
)
from tracer.engine.fingerprint import fingerprint

IDENTITY = Identity("f" * 64, 0, 3, "", fingerprint())
PROGRESS = Progress(4, 7, 0, 123_456, 99, 12.25, 0.1)
SHAPES = ((5,), (5,), (3, 4), (0,))
COUNT = 22


@pytest.fixture
def arrays() -> list[np.ndarray]:
    rng = np.random.default_rng(1)
    return [rng.random(shape) for shape in SHAPES]


@pytest.fixture
def written(tmp_path, arrays):
    path = tmp_path / "slot"
    write_checkpoint(path, IDENTITY, PROGRESS, arrays)
    return path


def read_whole(path) -> list[np.ndarray]:
    header = read_header(path)
    check_numbers(path, header, COUNT)
    found = [np.full(shape, np.nan) for shape in SHAPES]
    read_numbers(path, header, found)
    return found


def test_what_was_written_comes_back_to_the_last_bit(written, arrays):
    header = read_header(written)
    assert header.identity == IDENTITY
    assert header.progress == PROGRESS
    for found, array in zip(read_whole(written), arrays, strict=True):
        assert np.array_equal(found, array)
    assert [entry.name for entry in written.parent.iterdir()] == ["slot"]


def test_cut_at_any_byte_it_is_damaged(written):
    content = written.read_bytes()
    # The first and last bytes and 60 random ones: a file cut there never passes, wherever the cut lies.
    cuts = {0, 1, len(content) - 1, *random.Random(3).sample(range(len(content)), 60)}
    for cut in cuts:
        written.write_bytes(content[:cut])
        with pytest.raises(DamagedCheckpoint):
            read_whole(written)
    written.write_bytes(content + b"\0")
    with pytest.raises(DamagedCheckpoint, match="is not as long as it should be"):
        read_whole(written)


def test_with_any_bit_turned_it_is_damaged(written):
    content = written.read_bytes()
    chance = random.Random(4)
    for place in chance.sample(range(len(content)), 100):
        changed = bytearray(content)
        changed[place] ^= 1 << chance.randrange(8)
        written.write_bytes(changed)
        with pytest.raises(DamagedCheckpoint):
            read_whole(written)


def test_a_failed_write_keeps_the_old_checkpoint_and_no_half_one(written, arrays, monkeypatch):
    before = written.read_bytes()

    def fail(*_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", fail)
    with pytest.raises(OSError, match="No space left"):
        write_checkpoint(written, IDENTITY, PROGRESS._replace(folded=8), arrays)
    assert written.read_bytes() == before
    assert [entry.name for entry in written.parent.iterdir()] == ["slot"]


def forged(path, **changes) -> None:
    """Write a checkpoint with good checksums and false words."""
    words = {
        "format": checkpoint.FORMAT,
        **IDENTITY._asdict(),
        "fingerprint": IDENTITY.fingerprint._asdict(),
        **PROGRESS._asdict(),
        **changes,
    }
    content = json.dumps(words).encode()
    head = checkpoint.MAGIC + len(content).to_bytes(4, "little") + content
    path.write_bytes(head + hashlib.sha256(head).digest())


@pytest.mark.parametrize(
    "changes",
    [
        {"folded": "seven"},
        {"folded": -1},
        {"folded": 7.0},
        {"folded": True},
        {"folded": 10**40},
        {"kernel_seconds": float("nan")},
        {"wall_seconds": "1e400"},
        {"run_hash": ["a"]},
        {"fingerprint": {"package": "../../etc/passwd"}},
        {"fingerprint": None},
        {"stop": None},
    ],
)
def test_false_words_under_a_good_checksum_are_refused(tmp_path, changes):
    forged(tmp_path / "slot", **changes)
    with pytest.raises(DamagedCheckpoint, match="its header is damaged"):
        read_header(tmp_path / "slot")


def test_a_header_of_another_format_is_told(tmp_path):
    forged(tmp_path / "slot", format=2)
    with pytest.raises(DamagedCheckpoint, match="is of a format that this package does not know"):
        read_header(tmp_path / "slot")


def test_a_header_that_claims_gigabytes_is_not_read(tmp_path):
    path = tmp_path / "slot"
    path.write_bytes(checkpoint.MAGIC + (2**32 - 1).to_bytes(4, "little"))
    os.truncate(path, 2**33)
    with pytest.raises(DamagedCheckpoint, match="its header is damaged"):
        read_header(path)


def test_a_terabyte_of_numbers_is_refused_by_its_size_alone(written):
    os.truncate(written, 2**40)
    header = read_header(written)
    with pytest.raises(DamagedCheckpoint, match="is not as long as it should be"):
        check_numbers(written, header, COUNT)


@pytest.mark.skipif(os.name == "nt", reason="Windows has no named pipes in folders")
def test_what_is_no_plain_file_is_not_waited_for(tmp_path):
    os.mkfifo(tmp_path / "slot")
    with pytest.raises(DamagedCheckpoint, match="is no plain file"):
        read_header(tmp_path / "slot")
    os.unlink(tmp_path / "slot")
    (tmp_path / "slot").symlink_to("/dev/zero")
    with pytest.raises(DamagedCheckpoint, match="is no plain file"):
        read_header(tmp_path / "slot")


@pytest.mark.parametrize(
    ("changes", "reason"),
    [
        (
            {"run_hash": "0" * 64},
            "belongs to another run: another scene, seed or number of particles per batch",
        ),
        ({"first_batch": 20}, "begins with batch 0 where this run begins with 20"),
        ({"replicates": 5}, "keeps 3 replicates where this run keeps 5"),
        ({"stop": "{}"}, "was made with another ensemble.stop"),
    ],
)
def test_a_checkpoint_of_another_run_is_told_from_ours(changes, reason):
    assert why_not_ours(IDENTITY, IDENTITY) == ""
    assert why_not_ours(IDENTITY, IDENTITY._replace(**changes)) == reason


@pytest.mark.parametrize(
    ("changes", "reason"),
    [
        ({"package": "9.9"}, "exosphere-tracer 9.9 where this process has "),
        ({"sources": "0"}, "other sources of exosphere-tracer "),
        ({"numba": "0.1"}, "numba 0.1 where this process has "),
        ({"platform": "Darwin arm64 macOS 26"}, "platform Darwin arm64 macOS 26 where this process has "),
        ({"vectors": "X"}, "vector extensions X where this process has "),
    ],
)
def test_a_checkpoint_of_another_version_or_platform_is_told_from_ours(changes, reason):
    theirs = IDENTITY._replace(fingerprint=IDENTITY.fingerprint._replace(**changes))
    assert why_not_ours(theirs, IDENTITY).startswith(f"was made by {reason}")
