"""A field that holds a moment in UTC."""

from dataclasses import dataclass
from datetime import UTC, date, datetime
from typing import Annotated, Any

from pydantic import GetCoreSchemaHandler
from pydantic_core import CoreSchema, core_schema

from tracer.units import quoted

FIRST = datetime(1960, 1, 1, tzinfo=UTC)
"""The year in which UTC begins."""

LAST = datetime(2100, 1, 1, tzinfo=UTC)
EXAMPLE = "2001-05-26T00:00:00Z"


@dataclass(frozen=True)
class Moment:
    """Validator of a moment: a text in ISO 8601 or TOML's own date and time; without an offset it is UTC."""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Let this validator alone judge the field, and write the field as text."""
        return core_schema.no_info_plain_validator_function(
            self.read, serialization=core_schema.plain_serializer_function_ser_schema(moment_text)
        )

    def read(self, given: object) -> datetime:
        """Return the moment in UTC; ValueError says what is allowed."""
        moment = _moment(given)
        far = ValueError(
            f"{quoted(str(given))} is out of range; must be from {FIRST:%Y-%m-%d} to {LAST:%Y-%m-%d}"
        )
        try:
            moment = moment.replace(tzinfo=UTC) if moment.tzinfo is None else moment.astimezone(UTC)
        except OverflowError:
            raise far from None
        if not FIRST <= moment <= LAST:
            raise far
        return moment

    def kind(self) -> str:
        """What the field takes."""
        return f"moment in UTC, from {FIRST:%Y-%m-%d} to {LAST:%Y-%m-%d}"

    def example(self) -> str:
        """A moment, as the run file shows it."""
        return quoted(EXAMPLE)


def moment_text(moment: datetime) -> str:
    """Return a moment in UTC as ISO 8601 with a Z, without the digits of a second that are 0."""
    return moment.replace(tzinfo=None).isoformat() + "Z"


def _moment(given: object) -> datetime:
    if isinstance(given, datetime):
        return given
    if isinstance(given, date):
        return datetime(given.year, given.month, given.day, tzinfo=UTC)
    if not isinstance(given, str):
        raise ValueError(f"{quoted(given)} is no moment; write for example {quoted(EXAMPLE)}")
    try:
        return datetime.fromisoformat(given.strip())
    except (ValueError, OverflowError):
        raise ValueError(f"{quoted(given)} is no moment; write for example {quoted(EXAMPLE)}") from None


Epoch = Annotated[datetime, Moment()]
