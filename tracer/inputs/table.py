"""What all tables of an input file have in common, and how a law is told by its name."""

from collections.abc import Mapping
from pathlib import Path
from typing import Any

from pydantic import BaseModel, BeforeValidator, ConfigDict, PrivateAttr, model_validator
from pydantic.fields import FieldInfo
from pydantic_core import PydanticCustomError


class Table(BaseModel):
    """A frozen table: unknown keys are refused, nothing is converted silently."""

    model_config = ConfigDict(frozen=True, strict=True, extra="forbid", allow_inf_nan=False)

    @model_validator(mode="before")
    @classmethod
    def _freeze_lists(cls, given: Any) -> Any:
        if not isinstance(given, dict):
            return given
        return {key: tuple(value) if isinstance(value, list) else value for key, value in given.items()}


class FileTable(Table):
    """An input file as a whole, which knows its name: `file` begins every message about it."""

    _file: str = PrivateAttr(default="input file")
    _folder: Path = PrivateAttr(default=Path())

    @property
    def folder(self) -> Path:
        """The file's folder, where its relative paths begin; the current folder without a file."""
        return self._folder

    @property
    def file(self) -> str:
        """The file's name as it was asked for."""
        return self._file

    def model_post_init(self, context: Any, /) -> None:
        """Take the name of the file from the validation's context."""
        if isinstance(context, Mapping) and "file" in context:
            self._file = context["file"]
            self._folder = Path(self._file).absolute().parent


def fields_of(table: type[Table]) -> dict[str, FieldInfo]:
    """Return the fields of a table by their keys in the file; `from`, which Python reserves, is an alias."""
    return {field.alias or name: field for name, field in table.model_fields.items()}


def _law_by_its_name(given: Any) -> Any:
    return {"law": given} if isinstance(given, str) else given


NAMED_LAW = BeforeValidator(_law_by_its_name)
"""A law's name alone stands for its table with nothing but defaults."""


def conflict(key: str, reason: str) -> PydanticCustomError:
    """Return the error for values that are right alone and wrong together.

    Parameters
    ----------
    key : str
        The key to name, as a path that begins in the table at hand, for example `altitude.top`.
    reason : str
        What is wrong and what is allowed.
    """
    return PydanticCustomError("conflict", "{reason}", {"key": key, "reason": reason})
