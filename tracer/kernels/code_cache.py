"""Compiled kernels kept between starts in the user's cache folder.

numba's own cache looks at the one file that holds a function and returns stale code when a file that the function
calls was edited. Here the stamp is the hash of all kernel sources, each entry carries a digest, and any failure
(stale, damaged, unwritable) only costs the time of compiling again.
"""

import hashlib
import os
import pickle
import stat
import sys
from contextlib import suppress
from functools import cache
from pathlib import Path

from numba.core.caching import (
    CompileResultCacheImpl,
    FunctionCache,
    IndexDataCacheFile,
    NullCache,
    _CacheLocator,
)

_DIGEST_SIZE = hashlib.sha256().digest_size


def attach(dispatcher):
    """Give numba `dispatcher` the guarded cache and return it; without a usable folder it stays uncached."""
    try:
        dispatcher._cache = _GuardedCache(dispatcher.py_func)
    except Exception:
        dispatcher._cache = NullCache()
    return dispatcher


@cache
def source_hash():
    """Return the hash of all sources that are compiled into kernels, hexadecimal."""
    digest = hashlib.sha256()
    folder = Path(__file__).parent
    for path in [*sorted(folder.glob("*.py")), folder.parent / "fate.py"]:
        digest.update(path.name.encode() + b"\0" + path.read_bytes() + b"\0")
    return digest.hexdigest()


def cache_folder():
    """Return the folder of this version's compiled kernels inside the user's cache folder."""
    if sys.platform == "darwin":
        base = Path.home() / "Library" / "Caches"
    elif os.name == "nt":
        base = Path(os.environ.get("LOCALAPPDATA", Path.home()))
    else:
        base = Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache")
    return base / "exosphere-tracer" / source_hash()[:16]


def _make_private(folder):
    """Create `folder` with mode 0700 and refuse one that another user could fill: entries are unpickled."""
    folder.parent.parent.mkdir(parents=True, exist_ok=True)
    folder.parent.mkdir(exist_ok=True, mode=0o700)
    folder.mkdir(exist_ok=True, mode=0o700)
    status = folder.stat()
    if os.name != "nt" and (status.st_uid != os.getuid() or status.st_mode & (stat.S_IWGRP | stat.S_IWOTH)):
        raise PermissionError(f"{folder} may be written by others")


class _UserFolderLocator(_CacheLocator):
    def __init__(self, py_func, py_file):
        self._py_file = py_file
        self._line = py_func.__code__.co_firstlineno

    def get_cache_path(self):
        return str(cache_folder())

    def get_source_stamp(self):
        return source_hash()

    def get_disambiguator(self):
        return str(self._line)

    def ensure_cache_path(self):
        _make_private(cache_folder())

    @classmethod
    def from_function(cls, py_func, py_file):
        return cls(py_func, py_file)


class _CacheImpl(CompileResultCacheImpl):
    _locator_classes = (_UserFolderLocator,)


class _DigestedFiles(IndexDataCacheFile):
    """Index and data files whose content ends with its SHA-256, so that damage is noticed before unpickling."""

    def _dump(self, obj):
        payload = super()._dump(obj)
        return payload + hashlib.sha256(payload).digest()

    def _load_index(self):
        path = Path(self._index_path)
        if not path.exists():
            return {}
        content = path.read_bytes()
        head = pickle.dumps(self._version, protocol=-1)
        if not content.startswith(head):
            return {}
        stamp, overloads = pickle.loads(_verified(content[len(head) :]))
        return overloads if stamp == self._source_stamp else {}

    def _load_data(self, name):
        return pickle.loads(_verified(Path(self._data_path(name)).read_bytes()))


def _verified(content):
    payload, digest = content[:-_DIGEST_SIZE], content[-_DIGEST_SIZE:]
    if hashlib.sha256(payload).digest() != digest:
        raise ValueError("damaged cache entry")
    return payload


class _GuardedCache(FunctionCache):
    _impl_class = _CacheImpl

    def __init__(self, py_func):
        _make_private(cache_folder())
        super().__init__(py_func)
        self._cache_file = _DigestedFiles(self._cache_path, self._impl.filename_base, source_hash())

    def load_overload(self, sig, target_context):
        try:
            return super().load_overload(sig, target_context)
        except Exception:
            # A damaged index would refuse the save that follows as well.
            self._drop_index()
            return None

    def save_overload(self, sig, data):
        # Failing to keep the code must never stop the work that it was compiled for.
        with suppress(Exception):
            super().save_overload(sig, data)

    def _drop_index(self):
        with suppress(OSError):
            Path(self._cache_file._index_path).unlink()
