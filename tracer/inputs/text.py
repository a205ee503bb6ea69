"""Fields that hold text: names, titles and paths."""

import unicodedata
from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import GetCoreSchemaHandler
from pydantic_core import CoreSchema, core_schema

from tracer.units import quoted

_NOT_PRINTABLE = frozenset({"Cc", "Cs", "Zl", "Zp"})
"""Unicode categories that end a line, steer a terminal or cannot be written as UTF-8."""


@dataclass(frozen=True)
class OneLine:
    """Validator of a non-empty printable line of text."""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Let this validator alone judge the field."""
        return core_schema.no_info_plain_validator_function(self.read)

    def read(self, given: object) -> str:
        """Return the text; ValueError says what is allowed."""
        if not isinstance(given, str):
            raise ValueError(f"{quoted(given)} is not text; must be a text in quotes")
        if not given.strip():
            raise ValueError(f"{quoted(given)} is empty; must be a text in quotes")
        if any(unicodedata.category(character) in _NOT_PRINTABLE for character in given):
            raise ValueError(
                f"{quoted(given)} has line ends or control characters; must be one printable line"
            )
        return given

    def kind(self) -> str:
        """What the field takes."""
        return "text"


Line = Annotated[str, OneLine()]
FilePath = Annotated[str, OneLine()]
