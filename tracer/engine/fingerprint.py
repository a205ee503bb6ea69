"""What decides the last bit of a product beside the run itself: package, libraries, platform."""

import hashlib
import os
import platform
from functools import cache
from pathlib import Path
from typing import NamedTuple

import numba
import numpy as np

from tracer.product.provenance import package_version

PACKAGE = Path(__file__).resolve().parents[1]
WITHOUT_NUMBERS = ("commands", "plots")
"""Folders of the package that no number of a product passes through."""


class Fingerprint(NamedTuple):
    """Two processes with equal fingerprints trace a batch to the same last bit."""

    package: str
    sources: str
    """SHA-256 over the package's files, hexadecimal, for checkouts whose version stays the same."""
    numba: str
    numpy: str
    platform: str
    """System, processor family and C library, whose functions kernels call."""
    vectors: str
    """Vector extensions of the processor for which NumPy has functions of their own."""


FIELD_WORDS = {
    "package": "exosphere-tracer",
    "sources": "sources",
    "numba": "numba",
    "numpy": "numpy",
    "platform": "platform",
    "vectors": "vector extensions",
}


@cache
def fingerprint() -> Fingerprint:
    """Return the fingerprint of this process."""
    return Fingerprint(
        package=package_version(),
        sources=_source_digest(),
        numba=str(numba.__version__),
        numpy=np.__version__,
        platform=f"{platform.system()} {platform.machine()} {_c_library()}",
        vectors=" ".join(np.show_config(mode="dicts")["SIMD Extensions"].get("found", [])),
    )


def difference(theirs: Fingerprint, ours: Fingerprint) -> str:
    """Return in words the first thing that differs, empty where nothing does."""
    for name, their, our in zip(Fingerprint._fields, theirs, ours, strict=True):
        if their != our:
            if name == "sources":
                return f"other sources of {FIELD_WORDS['package']} {ours.package}"
            return f"{FIELD_WORDS[name]} {their or 'none'} where this process has {our or 'none'}"
    return ""


def _source_digest() -> str:
    digest = hashlib.sha256()
    for path in sorted([*PACKAGE.rglob("*.py"), *PACKAGE.rglob("*.csv")]):
        place = path.relative_to(PACKAGE)
        if place.parts[0] not in WITHOUT_NUMBERS:
            content = path.read_bytes()
            digest.update(f"{place.as_posix()} {len(content)}\n".encode() + content)
    return digest.hexdigest()


def _c_library() -> str:
    if platform.system() == "Darwin":
        return f"macOS {platform.mac_ver()[0]}"
    if hasattr(os, "confstr") and "CS_GNU_LIBC_VERSION" in os.confstr_names:
        return os.confstr("CS_GNU_LIBC_VERSION") or ""
    return ""
