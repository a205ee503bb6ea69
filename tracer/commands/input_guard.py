"""Outputs that would destroy what a command reads."""

import os
from collections.abc import Iterable

from tracer.errors import InputError


def refuse_inputs(path: str, inputs: Iterable[str | os.PathLike[str]]) -> None:
    """Raise InputError where the output `path` is one of the `inputs`."""
    for name in inputs:
        if os.path.realpath(path) == os.path.realpath(name):
            raise InputError(f"{path}: is read by this command; name another output")
