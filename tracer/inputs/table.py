"""What all tables of an input file have in common, and how a law is told by its name."""

from typing import Any

from pydantic import BaseModel, BeforeValidator, ConfigDict, model_validator
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
