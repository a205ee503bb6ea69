"""Hashes that say whether two runs are the same."""

import hashlib
from pathlib import Path

import numpy as np

from tracer.engine.scene import Scene


def scene_hash(scene: Scene, files: tuple[Path, ...]) -> str:
    """Return the SHA-256 over the resolved SI values of `scene` and the bytes of every `files` entry, hexadecimal."""
    digest = hashlib.sha256()
    _update(digest, scene)
    for path in files:
        digest.update(hashlib.sha256(path.read_bytes()).digest())
    return digest.hexdigest()


def run_hash(scene: str, seed: int, particles_per_batch: int) -> str:
    """Return the SHA-256 of scene hash `scene`, seed and particles per batch, hexadecimal."""
    return hashlib.sha256(f"{scene}|{seed}|{particles_per_batch}".encode()).hexdigest()


def _update(digest: "hashlib._Hash", value: object) -> None:
    """Feed one value with its type and size, so that different nestings cannot give the same bytes."""
    if isinstance(value, np.ndarray):
        digest.update(f"array{value.shape}{value.dtype.newbyteorder('<').str}".encode())
        digest.update(np.ascontiguousarray(value.astype(value.dtype.newbyteorder("<"))).tobytes())
    elif isinstance(value, tuple):
        digest.update(f"{type(value).__name__}{len(value)}(".encode())
        for item in value:
            _update(digest, item)
    elif isinstance(value, float):
        digest.update(f"float {value.hex()};".encode())
    elif value is None or isinstance(value, bool | int | str):
        digest.update(f"{type(value).__name__} {value!r};".encode())
    elif hasattr(value, "__dataclass_fields__"):
        _update(digest, tuple(getattr(value, name) for name in value.__dataclass_fields__))
    else:
        raise TypeError(f"a scene holds no {type(value).__name__}")
