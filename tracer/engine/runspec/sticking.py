"""Sticking of landing atoms: one number, or a law."""

from dataclasses import dataclass
from typing import Annotated, Any, Literal

from pydantic import Field, GetCoreSchemaHandler
from pydantic_core import CoreSchema, core_schema

from tracer.inputs.interval import Interval
from tracer.inputs.number import Fraction, Real
from tracer.inputs.quantity import Temperature
from tracer.inputs.table import Table
from tracer.units import quoted


class ExponentialSticking(Table):
    """Sticking by the temperature T of the ground, value exp(-(T - at)/e_folding), not above 1."""

    law: Literal["exponential"] = Field(description="Name of the law.")
    at: Temperature = Field(description="Temperature at which the probability is `value`.")
    value: Fraction = Field(description="Probability at the temperature `at`.")
    e_folding: Temperature = Field(description="Rise of temperature by which it falls by a factor e.")


@dataclass(frozen=True)
class NumberOrLaw(Real):
    """Validator of a number, or of a table that is a law."""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Take a number as it is and leave tables to the law."""
        return core_schema.no_info_wrap_validator_function(
            self.read_either,
            handler.generate_schema(ExponentialSticking),
            serialization=core_schema.plain_serializer_function_ser_schema(_plain),
        )

    def read_either(self, given: object, read_table: core_schema.ValidatorFunctionWrapHandler) -> object:
        """Return the number or the law; ValueError says what is wrong and what is allowed."""
        if isinstance(given, dict | ExponentialSticking):
            return read_table(given)
        if isinstance(given, str):
            raise ValueError(f"{quoted(given)} is not a number; must be a {self.kind()}")
        return Real(self.interval).read(given)

    def kind(self) -> str:
        """What the field takes."""
        return (
            f'{super().kind()} or {{ law = "exponential", at = "250 K", value = 0.5, e_folding = "272.8 K" }}'
        )


def _plain(sticking: float | ExponentialSticking) -> Any:
    return sticking.model_dump() if isinstance(sticking, ExponentialSticking) else sticking


StickingLaw = Annotated[float | ExponentialSticking, NumberOrLaw(Interval(at_least=0.0, at_most=1.0))]
