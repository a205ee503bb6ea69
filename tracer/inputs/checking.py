"""The tables of an input file, checked against what such a file may hold."""

import os
from collections.abc import Mapping
from typing import Any, TypeVar

from pydantic import ValidationError

from tracer.errors import InputError
from tracer.inputs.messages import validation_message
from tracer.inputs.table import FileTable
from tracer.inputs.toml import tables

Spec = TypeVar("Spec", bound=FileTable)


def parsed(root: type[Spec], text: str, file: str | os.PathLike[str]) -> Spec:
    """Return the TOML `text` of an input file as a `root`; `file` is as in `checked`, and need not exist.

    Raises
    ------
    InputError
        The text is no TOML or cannot be used.
    """
    name = os.fspath(file)
    return checked(root, tables(text, name), name)


def checked(root: type[Spec], given: Mapping[str, Any], name: str) -> Spec:
    """Return the tables `given` as a `root`; `name` is the file's, in messages and for the paths in it.

    Raises
    ------
    InputError
        They cannot be used; the message says file, key, value and what is allowed.
    """
    try:
        return root.model_validate(given, context={"file": name})
    except ValidationError as error:
        raise InputError(f"{name}: {validation_message(error, root, given)}") from None
