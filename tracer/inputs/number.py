"""Fields that hold a bare number: real or whole, each with its range."""

import sys
from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import GetCoreSchemaHandler
from pydantic_core import CoreSchema, core_schema

from tracer.inputs.interval import EVERYTHING, Interval
from tracer.units import quoted

LARGEST_INTEGER = 2**63 - 1
MOST_CELLS = 4096


@dataclass(frozen=True)
class Real:
    """Validator of a finite real number; whole numbers count, `true` and `false` do not."""

    interval: Interval = EVERYTHING
    meaning: str = "number"

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Let this validator alone judge the field."""
        return core_schema.no_info_plain_validator_function(self.read)

    def read(self, given: object) -> float:
        """Return the number; ValueError says what is allowed."""
        if isinstance(given, bool) or not isinstance(given, int | float):
            raise ValueError(f"{quoted(given)} is not a number; must be a {self.kind()}")
        # A comparison, unlike float(), takes whole numbers of any size; it is false for nan.
        if not (abs(given) <= sys.float_info.max and self.interval.holds(given)):
            raise ValueError(f"{quoted(given)} is out of range; must be a {self.kind()}")
        return float(given)

    def kind(self) -> str:
        """What the field takes, for example `number from 0 to 1`."""
        return f"{self.meaning} {self.interval.words()}".rstrip()


@dataclass(frozen=True)
class Whole:
    """Validator of a whole number of at most 64 bits; `20.0`, `true` and `false` are none."""

    interval: Interval = EVERYTHING

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Let this validator alone judge the field."""
        return core_schema.no_info_plain_validator_function(self.read)

    def read(self, given: object) -> int:
        """Return the number; ValueError says what is allowed."""
        if isinstance(given, bool) or not isinstance(given, int):
            raise ValueError(f"{quoted(given)} is not a whole number; must be a {self.kind()}")
        if given > LARGEST_INTEGER and self.interval.at_most is None:
            raise ValueError(f"{quoted(given)} is out of range; must be at most {LARGEST_INTEGER}")
        if not self.interval.holds(given):
            raise ValueError(f"{quoted(given)} is out of range; must be a {self.kind()}")
        return given

    def kind(self) -> str:
        """What the field takes, for example `whole number at least 2`."""
        return f"whole number {self.interval.words()}".rstrip()


@dataclass(frozen=True)
class NoneOrWhole(Whole):
    """Validator of a whole number that is 0 or inside the interval."""

    def read(self, given: object) -> int:
        """Return the number; ValueError says what is allowed."""
        return 0 if given == 0 and isinstance(given, int) and given is not False else super().read(given)

    def kind(self) -> str:
        """What the field takes, for example `whole number from 8 to 256, or 0`."""
        return f"{super().kind()}, or 0"


Fraction = Annotated[float, Real(Interval(at_least=0.0, at_most=1.0))]
Albedo = Annotated[float, Real(Interval(at_least=0.0, below=1.0))]
Emissivity = Annotated[float, Real(Interval(above=0.0, at_most=1.0))]
Exponent = Annotated[float, Real(Interval(at_least=0.0))]
Eccentricity = Annotated[float, Real(Interval(at_least=0.0, below=1.0))]
LocalTime = Annotated[float, Real(Interval(at_least=0.0, below=24.0), "number of hours")]
HourOfDay = Annotated[float, Real(Interval(at_least=0.0, at_most=24.0), "number of hours")]
RelativeError = Annotated[float, Real(Interval(above=0.0, below=1.0))]
Cells = Annotated[int, Whole(Interval(at_least=1, at_most=MOST_CELLS))]
Count = Annotated[int, Whole(Interval(at_least=1))]
CountOrNone = Annotated[int, Whole(Interval(at_least=0))]
SpeedBins = Annotated[int, NoneOrWhole(Interval(at_least=8, at_most=256))]
SeveralOf = Annotated[int, Whole(Interval(at_least=2))]
