"""[sun]: where the body stands in sunlight, and what the Sun does."""

from datetime import datetime
from typing import Any, Literal

from pydantic import Field, model_validator

from tracer.engine.runspec.moment import Epoch, moment_text
from tracer.inputs.number import Fraction
from tracer.inputs.quantity import Angle, Length, RadialVelocity
from tracer.inputs.table import Table, conflict
from tracer.units import Quantity

PLACES = ("true_anomaly", "epoch", "distance")
"""The keys of which one says where the body stands."""


class SunTable(Table):
    """The Sun; left out there is no light, no tide and no turning frame, and +x still points to it."""

    true_anomaly: Angle | None = Field(
        None,
        description="Where the body, or its host, stands on its orbit; one of this, `epoch` and `distance` is "
        "needed.",
    )
    epoch: Epoch | None = Field(
        None,
        description="The moment: a planet of the catalogue or the Moon stands where the ephemeris has it, in place of "
        "`true_anomaly`.",
    )
    distance: Length | None = Field(
        None,
        description="Distance of the body, or its host, from the Sun, in place of `true_anomaly`.",
    )
    radial_velocity: RadialVelocity | None = Field(
        None,
        description='Heliocentric, positive away from the Sun; only with `distance`. Default: `"0 km/s"`.',
    )
    tide: bool = Field(True, description="Whether the Sun's tide acts on the atoms.")
    motion: Literal["stationary", "moving"] = Field(
        "stationary",
        description="Whether distance and velocity of the body stay the same while atoms fly, or the body travels on "
        "its orbit. Moving, density and images are those at the stated position, fluxes those of the last degree of "
        "mean anomaly, or of a moon's phase, before it, and the ledger is that of the atoms released there; needs an "
        "orbit. A moon with a host goes round it meanwhile, and has the phase angle at the stated position; "
        "stationary, the host keeps its place, and the frame turns, with the Sun's direction, as the moon goes about "
        "the host: right for gravity, and for light while that turns little.",
    )
    shadow: Literal["penumbra", "cylinder", "none"] = Field(
        "penumbra",
        description="Shadow of the body: cones of umbra and penumbra, a cylinder of the body's radius, or none. A "
        "host's is always cones, unless there is none.",
    )
    solar_activity: Fraction = Field(
        0.0, description="Activity between the quiet Sun, 0, and the active, 1; interpolates the photo-rates."
    )

    @model_validator(mode="before")
    @classmethod
    def _stand_still_by_default(cls, given: Any) -> Any:
        # Not the field's own default: beside a true anomaly, which sets the velocity, there must be none.
        if isinstance(given, dict) and "distance" in given:
            return {"radial_velocity": Quantity(0.0, "km/s"), **given}
        return given

    @model_validator(mode="after")
    def _stands_in_one_place(self) -> "SunTable":
        given = [key for key in PLACES if getattr(self, key) is not None]
        if not given:
            raise conflict(
                "true_anomaly",
                'missing; one of true_anomaly, epoch and distance is needed; write for example "60 deg"',
            )
        if len(given) > 1:
            first, second = given[0], given[1]
            texts = {key: _text(getattr(self, key)) for key in (first, second)}
            raise conflict(
                second,
                f'"{texts[second]}" stands beside {first} "{texts[first]}"; must be one of the two',
            )
        if self.motion == "moving" and self.distance is not None:
            raise conflict(
                "motion",
                '"moving" stands beside distance; it needs a place on the orbit: true_anomaly or epoch',
            )
        if self.distance is None and self.radial_velocity is not None:
            raise conflict(
                "radial_velocity",
                f'"{self.radial_velocity}" needs distance; with {given[0]} it follows from the orbit',
            )
        return self


def _text(value: Quantity | datetime) -> str:
    return moment_text(value) if isinstance(value, datetime) else str(value)
