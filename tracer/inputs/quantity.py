"""Fields that hold a quantity with its unit, each with its dimension and range."""

from dataclasses import dataclass
from typing import Annotated, Any, Literal

from pydantic import GetCoreSchemaHandler
from pydantic_core import CoreSchema, core_schema

from tracer.inputs.interval import EVERYTHING, Interval
from tracer.units import DIMENSIONS, RADII, Quantity, parse, quoted, si


@dataclass(frozen=True)
class Measured:
    """Validator of a quantity of one dimension, or of one of a few words in its place."""

    dimension: str
    interval: Interval = EVERYTHING
    zero_allowed: bool = True
    words: tuple[str, ...] = ()

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        """Let this validator alone judge the field, and write the field as text."""
        return core_schema.no_info_plain_validator_function(
            self.read, serialization=core_schema.plain_serializer_function_ser_schema(str)
        )

    def read(self, given: object) -> Quantity | str:
        """Return the quantity, or the word; ValueError says what is wrong and what is allowed."""
        if isinstance(given, str) and given in self.words:
            return given
        try:
            quantity = parse(str(given) if isinstance(given, Quantity) else given, self.dimension)
        except ValueError as error:
            raise ValueError(f"{error}{self._or_words()}") from None
        # A length in radii has the sign of its value, and only signs are asked of such lengths.
        value = quantity.value if quantity.unit == RADII else si(quantity)
        if not self.interval.holds(value) or (value == 0.0 and not self.zero_allowed):
            raise ValueError(f"{quoted(str(quantity))} is out of range; must be {self.range_words()}")
        return quantity

    def kind(self) -> str:
        """What the field takes, for the reference: for example `quantity of temperature above 0 K`."""
        wanted = DIMENSIONS[self.dimension]
        radii = " (`radii` allowed)" if wanted.radii_allowed else ""
        return f"quantity of {wanted.word}{radii} {self.range_words()}".rstrip() + self._or_words()

    def example(self) -> str:
        """A value of the dimension, as the file shows it."""
        return quoted(DIMENSIONS[self.dimension].example)

    def range_words(self) -> str:
        """The allowed range in words; empty where every value is allowed."""
        unit = "" if self.dimension == "length or radii" else DIMENSIONS[self.dimension].unit
        return self.interval.words(unit) if self.zero_allowed else f"other than 0 {unit}"

    def _or_words(self) -> str:
        return "".join(f" or {quoted(word)}" for word in self.words)


POSITIVE = Interval(above=0.0)
NOT_NEGATIVE = Interval(at_least=0.0)

Length = Annotated[Quantity, Measured("length", Interval(above=0.0, at_most=1e18))]
LengthOrRadii = Annotated[Quantity, Measured("length or radii", POSITIVE)]
AltitudeEnd = Annotated[Quantity, Measured("length or radii", NOT_NEGATIVE)]
Wavelength = Annotated[Quantity, Measured("wavelength", POSITIVE)]
SkyOffset = Annotated[Quantity, Measured("length or radii")]
Temperature = Annotated[Quantity, Measured("temperature", POSITIVE)]
TemperatureOrSurface = Annotated[
    Quantity | Literal["surface"], Measured("temperature", POSITIVE, words=("surface",))
]
Speed = Annotated[Quantity, Measured("speed", POSITIVE)]
RadialVelocity = Annotated[Quantity, Measured("speed")]
LineOfSightVelocity = Annotated[Quantity, Measured("speed", Interval(at_least=-3e8, at_most=3e8))]
"""No further than light."""
Angle = Annotated[Quantity, Measured("angle")]
Latitude = Annotated[Quantity, Measured("angle", Interval(at_least=-90.0, at_most=90.0))]
Rate = Annotated[Quantity, Measured("rate", Interval(above=0.0, at_most=1e35))]
"""Replicates are kept in single precision, which ends at 3e38."""
LossRate = Annotated[Quantity, Measured("rate", NOT_NEGATIVE)]
Frequency = Annotated[Quantity, Measured("rate", POSITIVE)]
Area = Annotated[Quantity, Measured("area", POSITIVE)]
PhotonFlux = Annotated[Quantity, Measured("photon flux", POSITIVE)]
PolarAngle = Annotated[Quantity, Measured("angle", Interval(at_least=0.0, at_most=90.0))]
Energy = Annotated[Quantity, Measured("energy", POSITIVE)]
Mass = Annotated[Quantity, Measured("mass", POSITIVE)]
ThermalInertia = Annotated[Quantity, Measured("thermal inertia", POSITIVE)]
Conductivity = Annotated[Quantity, Measured("thermal conductivity", POSITIVE)]
MassDensity = Annotated[Quantity, Measured("mass density", POSITIVE)]
HeatCapacity = Annotated[Quantity, Measured("heat capacity", POSITIVE)]
Duration = Annotated[Quantity, Measured("time", Interval(above=0.0, at_most=1e18))]
RotationPeriod = Annotated[Quantity, Measured("time", zero_allowed=False)]
GravitationalParameter = Annotated[Quantity, Measured("gravitational parameter", NOT_NEGATIVE)]
AccelerationOrWord = Annotated[
    Quantity | Literal["lines", "none"], Measured("acceleration", NOT_NEGATIVE, words=("lines", "none"))
]
