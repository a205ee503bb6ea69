"""One maker at a time for each output file."""

import errno
import os
import sys
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from tracer.errors import InputError, TracerError

WITHOUT_LOCKS = (errno.ENOSYS, errno.ENOTSUP, errno.EOPNOTSUPP, errno.ENOLCK)
"""Errors of file systems that know no locks, as on some clusters; the work goes on without one."""

if sys.platform == "win32":
    import msvcrt

    def _try_lock(descriptor: int) -> None:
        msvcrt.locking(descriptor, msvcrt.LK_NBLCK, 1)
else:
    import fcntl

    def _try_lock(descriptor: int) -> None:
        fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)


@contextmanager
def output_lock(path: str | os.PathLike[str]) -> Iterator[None]:
    """Hold the right to make the output `path`, by a lock on a hidden file beside it.

    The system drops the lock of a process that dies, so that a file left behind binds nobody. The hidden file
    is removed at the end.

    Parameters
    ----------
    path : path
        The output; it need not exist.

    Raises
    ------
    InputError
        At once where another process, or another part of this one, holds the lock; or where the folder is
        missing or not writable.
    TracerError
        Where the system cannot lock for any other reason.
    """
    target = Path(os.path.realpath(path))
    hidden = target.with_name(f".{target.name}.lock")
    descriptor = _acquire(hidden, path)
    try:
        yield
    finally:
        _release(hidden, descriptor)


def _acquire(hidden: Path, path: str | os.PathLike[str]) -> int:
    while True:
        descriptor = _open(hidden, path)
        try:
            _try_lock(descriptor)
        except (BlockingIOError, PermissionError):
            os.close(descriptor)
            raise InputError(
                f"{os.fspath(path)}: is being made by another run; wait for it, or name another output"
            ) from None
        except OSError as error:
            if error.errno in WITHOUT_LOCKS:
                return descriptor
            os.close(descriptor)
            raise TracerError(f"{os.fspath(path)}: cannot be locked: {error.strerror}") from None
        # The last holder may have removed the file between opening and locking: then this lock binds nobody.
        if _is_named(hidden, descriptor):
            return descriptor
        os.close(descriptor)


def _open(hidden: Path, path: str | os.PathLike[str]) -> int:
    try:
        return os.open(hidden, os.O_RDWR | os.O_CREAT, 0o666)
    except FileNotFoundError:
        raise InputError(f"{os.fspath(path)}: there is no folder {hidden.parent}") from None
    except OSError as error:
        raise InputError(f"{os.fspath(path)}: cannot write in {hidden.parent}: {error.strerror}") from None


def _is_named(hidden: Path, descriptor: int) -> bool:
    try:
        return os.path.samestat(os.stat(hidden), os.fstat(descriptor))
    except FileNotFoundError:
        return False


def _release(hidden: Path, descriptor: int) -> None:
    if sys.platform == "win32":
        os.close(descriptor)
        with suppress(OSError):
            hidden.unlink()
        return
    # Removed while still held: whoever waits with the old file open sees that its name is gone.
    with suppress(OSError):
        hidden.unlink()
    os.close(descriptor)
