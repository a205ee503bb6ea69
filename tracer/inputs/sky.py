"""Directions from the body: a word, or a latitude and a local time."""

from dataclasses import dataclass
from typing import Annotated, Any, Literal

from pydantic import Field, GetCoreSchemaHandler
from pydantic_core import CoreSchema, core_schema

from tracer.inputs.number import LocalTime
from tracer.inputs.quantity import Latitude
from tracer.inputs.table import Table
from tracer.units import quoted


class SkyPoint(Table):
    """A direction from the body's centre."""

    latitude: Latitude = Field(description="Latitude of the direction.")
    local_time: LocalTime = Field(
        description="Local time of the direction: 12 noon, 18 dusk, 0 midnight, 6 dawn."
    )


@dataclass(frozen=True)
class WordOrPoint:
    """Validator of a direction by one of a few words, or by a table of latitude and local time."""

    words: tuple[str, ...]

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Take a word as it is and leave all else to the table."""
        return core_schema.no_info_wrap_validator_function(
            self.read,
            handler.generate_schema(SkyPoint),
            serialization=core_schema.plain_serializer_function_ser_schema(_plain),
        )

    def read(self, given: object, read_point: core_schema.ValidatorFunctionWrapHandler) -> object:
        """Return the word or the table; ValueError says what is allowed."""
        if isinstance(given, dict | SkyPoint):
            return read_point(given)
        if isinstance(given, str) and given in self.words:
            return given
        raise ValueError(f"{quoted(given)} is not a direction; must be {self.kind()}")

    def kind(self) -> str:
        """What the field takes."""
        return ", ".join(quoted(word) for word in self.words) + " or a table of latitude and local_time"


def _plain(direction: Any) -> Any:
    return direction.model_dump() if isinstance(direction, SkyPoint) else direction


PlaceDirection = Annotated[Literal["sun", "dawn"] | SkyPoint, WordOrPoint(("sun", "dawn"))]
ViewerDirection = Annotated[
    Literal["north", "south", "dawn", "dusk", "sun", "midnight"] | SkyPoint,
    WordOrPoint(("north", "south", "dawn", "dusk", "sun", "midnight")),
]
