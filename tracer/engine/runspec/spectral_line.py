"""[[gas.line]]: emission lines of the user's own."""

from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import Field, GetCoreSchemaHandler
from pydantic_core import CoreSchema, core_schema

from tracer.inputs.quantity import NOT_NEGATIVE, Measured, Wavelength
from tracer.inputs.table import Table
from tracer.inputs.text import FilePath, Line
from tracer.units import Quantity


class GTable(Table):
    """The g-factor by heliocentric radial velocity, in place of one rate."""

    file: FilePath = Field(description="CSV of the atom's radial velocity [km/s] and g at 1 au [s-1].")


@dataclass(frozen=True)
class RateOrFile(Measured):
    """Validator of a rate, or of a table that names a file."""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Take a rate as text and leave tables to `GTable`."""
        return core_schema.no_info_wrap_validator_function(
            self.read_either,
            handler.generate_schema(GTable),
            serialization=core_schema.plain_serializer_function_ser_schema(_plain),
        )

    def read_either(self, given: object, read_table: core_schema.ValidatorFunctionWrapHandler) -> object:
        """Return the rate or the table; ValueError says what is wrong and what is allowed."""
        return read_table(given) if isinstance(given, dict | GTable) else self.read(given)

    def _or_words(self) -> str:
        return ' or { file = "g.csv" }'


def _plain(g: Quantity | GTable) -> Any:
    return g.model_dump() if isinstance(g, GTable) else str(g)


GFactor = Annotated[Quantity | GTable, RateOrFile("rate", NOT_NEGATIVE)]


class SpectralLineTable(Table):
    """An emission line, beside those of the catalogue."""

    name: Line = Field(description="Name of the line, the label along the product's `line` dimension.")
    wavelength: Wavelength = Field(description="Wavelength in vacuum.")
    g: GFactor = Field(description="Photons scattered per second by one atom at 1 au, the g-factor.")
