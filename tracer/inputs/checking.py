"""The tables of an input file, checked against what such a file may hold."""

from collections.abc import Mapping
from typing import Any, TypeVar

from pydantic import ValidationError

from tracer.errors import InputError
from tracer.inputs.messages import validation_message
from tracer.inputs.table import FileTable

Spec = TypeVar("Spec", bound=FileTable)


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
