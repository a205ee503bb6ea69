"""Outputs that would destroy what a command reads, and errors that say which input they are about."""

import os
from collections.abc import Iterable, Iterator
from contextlib import contextmanager

from tracer.errors import InputError


def refuse_inputs(path: str, inputs: Iterable[str | os.PathLike[str]]) -> None:
    """Raise InputError where the output `path` is one of the `inputs`."""
    for name in inputs:
        if os.path.realpath(path) == os.path.realpath(name):
            raise InputError(f"{path}: is read by this command; name another output")


@contextmanager
def about(name: str) -> Iterator[None]:
    """Put the `name` of the file at hand before the message of an InputError."""
    try:
        yield
    except InputError as error:
        raise InputError(f"{name}: {error}") from None
