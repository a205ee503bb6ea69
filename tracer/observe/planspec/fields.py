"""Fields that plans have and run files have not."""

from typing import Annotated, Literal

from tracer.inputs.interval import Interval
from tracer.inputs.number import Real, Whole
from tracer.inputs.quantity import NOT_NEGATIVE, POSITIVE, Measured
from tracer.units import Quantity

Vector = tuple[Annotated[float, Real()], Annotated[float, Real()], Annotated[float, Real()]]
Area = Annotated[Quantity, Measured("area", POSITIVE)]
FieldAngle = Annotated[Quantity, Measured("angle", Interval(above=0.0, at_most=120.0))]
KeepOutAngle = Annotated[Quantity, Measured("angle", Interval(at_least=0.0, at_most=180.0))]
CountRate = Annotated[Quantity, Measured("rate", NOT_NEGATIVE)]
Throughput = Annotated[float, Real(Interval(above=0.0, at_most=1.0))]
Counts = Annotated[float, Real(NOT_NEGATIVE)]
SomeCounts = Annotated[float, Real(POSITIVE)]
Samples = Annotated[int, Whole(Interval(at_least=1, at_most=101))]
Steps = Annotated[int, Whole(Interval(at_least=2, at_most=100_000))]
Side = Literal["dawn", "dusk", "north", "south", "sunward", "tailward"]
