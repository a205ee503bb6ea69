"""Fields that observation files have and other input files have not."""

from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import GetCoreSchemaHandler
from pydantic_core import CoreSchema, core_schema

from tracer.inputs.interval import EVERYTHING, Interval
from tracer.inputs.number import Real
from tracer.inputs.quantity import NOT_NEGATIVE, POSITIVE, Measured
from tracer.units import DIMENSIONS, RADII, Quantity, conversion_factor, parse, quoted


@dataclass(frozen=True)
class OneOf:
    """Validator of a quantity of one of several dimensions, told apart by its unit."""

    dimensions: tuple[str, ...]
    interval: Interval = EVERYTHING

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Let this validator alone judge the field, and write the field as text."""
        return core_schema.no_info_plain_validator_function(
            self.read, serialization=core_schema.plain_serializer_function_ser_schema(str)
        )

    def read(self, given: object) -> Quantity:
        """Return the quantity; ValueError says what is wrong and what is allowed."""
        words = [DIMENSIONS[name].word for name in self.dimensions]
        try:
            quantity = parse(given, self._dimension_of(given))
        except ValueError as error:
            raise ValueError(f"{error} (a quantity of {' or '.join(words)})") from None
        if not self.interval.holds(quantity.value):
            raise ValueError(f"{quoted(str(quantity))} is out of range; must be {self.interval.words()}")
        return quantity

    def kind(self) -> str:
        """What the field takes, for the reference."""
        words = (
            DIMENSIONS[name].word + (" (`radii` allowed)" if DIMENSIONS[name].radii_allowed else "")
            for name in self.dimensions
        )
        return f"quantity of {' or '.join(words)} {self.interval.words()}".rstrip()

    def example(self) -> str:
        """A value of the first dimension, as the file shows it."""
        return quoted(DIMENSIONS[self.dimensions[0]].example)

    def _dimension_of(self, given: object) -> str:
        """Return the dimension that the unit of `given` has; the first where it has none of them."""
        unit = str(given).strip().lstrip("+-.0123456789eE_").strip() if isinstance(given, str) else ""
        for name in self.dimensions:
            wanted = DIMENSIONS[name]
            if (unit == RADII and wanted.radii_allowed) or conversion_factor(unit, wanted.unit) is not None:
                return name
        return self.dimensions[0]


@dataclass(frozen=True)
class Ranged:
    """Validator of a parameter: one quantity, which is held, or `[from, to]`, within which it is fitted."""

    measured: Measured

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Let this validator alone judge the field."""
        return core_schema.no_info_plain_validator_function(
            self.read,
            serialization=core_schema.plain_serializer_function_ser_schema(
                lambda ends: [str(end) for end in ends]
            ),
        )

    def read(self, given: object) -> tuple[Quantity, ...]:
        """Return one quantity or two; ValueError says what is wrong and what is allowed."""
        if not isinstance(given, list | tuple):
            return (self._one(given),)
        if len(given) != 2:
            raise ValueError(f"{quoted(list(given))} has {len(given)} entries; must be a {self.kind()}")
        low, high = (self._one(end) for end in given)
        factor = conversion_factor(high.unit, low.unit)
        if factor is None or not low.value < high.value * factor:
            raise ValueError(f'["{low}", "{high}"] is no range; the first must be below the second')
        return low, high

    def kind(self) -> str:
        """What the field takes, for the reference."""
        return f"{self.measured.kind()}, or a list of two of them"

    def example(self) -> str:
        """A range of the dimension, as the file shows it."""
        value = self.measured.read(DIMENSIONS[self.measured.dimension].example)
        assert isinstance(value, Quantity)
        return f'["{Quantity(0.5 * value.value, value.unit)}", "{Quantity(3.0 * value.value, value.unit)}"]'

    @property
    def dimension(self) -> str:
        """The dimension, a key of `DIMENSIONS`."""
        return self.measured.dimension

    def _one(self, given: object) -> Quantity:
        quantity = self.measured.read(given)
        assert isinstance(quantity, Quantity)
        return quantity


LENGTH_OR_ANGLE = ("length or radii", "angle")

SkyLength = Annotated[Quantity, OneOf(LENGTH_OR_ANGLE, NOT_NEGATIVE)]
SkyWidth = Annotated[Quantity, OneOf(LENGTH_OR_ANGLE, POSITIVE)]
SkyPlace = Annotated[Quantity, OneOf(LENGTH_OR_ANGLE)]
Level = Annotated[Quantity, OneOf(("brightness", "column density"))]
TurnOrWord = Annotated[Quantity | str, Measured("angle", words=("along", "across"))]
RateOrWord = Annotated[
    Quantity | str, Measured("rate", Interval(above=0.0, at_most=1e35), words=("free", "product"))
]
PhaseAngle = Annotated[Quantity, Measured("angle", Interval(at_least=0.0, at_most=180.0))]
MoffatPower = Annotated[float, Real(Interval(above=1.0, at_most=100.0))]
TemperatureRange = Annotated[tuple[Quantity, ...], Ranged(Measured("temperature", POSITIVE))]
EnergyRange = Annotated[tuple[Quantity, ...], Ranged(Measured("energy", POSITIVE))]
