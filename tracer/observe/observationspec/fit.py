"""[background], [fit]: what is to be found."""

from typing import Literal

from pydantic import Field, model_validator

from tracer.inputs.table import Table, conflict
from tracer.inputs.text import Line
from tracer.observe.observationspec.fields import EnergyRange, Level, RateOrWord, TemperatureRange
from tracer.units import Quantity, si

LAW_PARAMETERS = {
    "maxwell-flux": ("temperature",),
    "maxwell-gas": ("temperature",),
    "sigmund-thompson": ("binding_energy", "cutoff_energy"),
}
"""Laws of the launch speed whose parameters can be fitted, with the names of these."""
PARAMETERS = ("temperature", "binding_energy", "cutoff_energy")


class BackgroundTable(Table):
    """Light or column that is not the body's gas, the same at all points."""

    fitted: bool = Field(False, description="Whether a constant of either sign is fitted.")
    level: Level | None = Field(
        None, description="Known level, which the model gets added; goes with `fitted = false`. Default: 0."
    )

    @model_validator(mode="after")
    def _is_known_or_fitted(self) -> "BackgroundTable":
        if self.fitted and self.level is not None:
            raise conflict("level", "goes with fitted = false alone")
        return self


class ReleaseFit(Table):
    """What is fitted of one release."""

    name: Line = Field(description="Name of the release in the product.")
    rate: RateOrWord = Field(
        "free",
        description='`"free"` at or above 0, held at that of the `"product"`, or held at a rate of your own.',
    )
    law: Literal["maxwell-flux", "maxwell-gas", "sigmund-thompson"] | None = Field(
        None,
        description="Law of launch speeds to put in place of the run's, evaluated from the product's responses "
        "(`ensemble.speed_bins`). Default: that of the run.",
    )
    temperature: TemperatureRange | None = Field(
        None, description="Of a Maxwellian: a range to fit it in, or a value to hold. Default: the run's."
    )
    binding_energy: EnergyRange | None = Field(None, description="The same for sputtered atoms.")
    cutoff_energy: EnergyRange | None = Field(None, description="The same for sputtered atoms.")

    @model_validator(mode="after")
    def _has_parameters_of_its_law(self) -> "ReleaseFit":
        for key in PARAMETERS:
            if (
                self.law is not None
                and getattr(self, key) is not None
                and key not in LAW_PARAMETERS[self.law]
            ):
                raise conflict(key, f'is no parameter of law "{self.law}"')
        if self.law is not None:
            missing = [key for key in LAW_PARAMETERS[self.law] if getattr(self, key) is None]
            if missing:
                raise conflict(missing[0], f'missing; law = "{self.law}" needs it, as a value or a range')
        return self


class FitTable(Table):
    """Which releases make the profile, and what is free in them."""

    releases: tuple[Line, ...] | None = Field(
        None,
        description="Names of the releases that are to explain the profile. Default: all of the products'.",
    )
    release: tuple[ReleaseFit, ...] = Field(
        (), description="What differs from a free rate and the run's own law; one table for a release."
    )

    @model_validator(mode="after")
    def _names_each_release_once(self) -> "FitTable":
        known: dict[str, int] = {}
        for number, entry in enumerate(self.release, 1):
            if (first := known.setdefault(entry.name, number)) != number:
                raise conflict(
                    f"release[{number}].name", f'"{entry.name}" is already the name of release[{first}]'
                )
        if self.releases is not None and not self.releases:
            raise conflict("releases", "[] is empty; must name at least one release")
        return self


def is_fitted(ends: tuple[Quantity, ...] | None) -> bool:
    """Return whether a parameter's entry is a range."""
    return ends is not None and len(ends) == 2


def values(ends: tuple[Quantity, ...]) -> tuple[float, ...]:
    """Return a parameter's value or its range in SI units."""
    return tuple(si(end) for end in ends)
