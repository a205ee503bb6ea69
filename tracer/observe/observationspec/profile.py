"""[profile]: what was measured, and where in the sky."""

from typing import Literal

from pydantic import Field, model_validator

from tracer.inputs.quantity import Angle
from tracer.inputs.table import Table, conflict
from tracer.inputs.text import FilePath, Line
from tracer.observe.observationspec.fields import SkyPlace
from tracer.observe.planspec.fields import Side
from tracer.units import Quantity

UNIT_WORDS = "Otherwise that of the column of an ECSV file, or what its name ends with: "


class ProfileTable(Table):
    """A measured profile: a CSV or ECSV table with a row for each point, and what its columns mean."""

    file: FilePath = Field(
        description="The table, CSV or ECSV. Rows run one way in position; equal positions may follow each other."
    )
    position: Line = Field(description="Column of the positions.")
    value: Line = Field(description="Column of the measured values; for an upper limit, the limit.")
    sigma: Line = Field(
        description="Column of the standard errors, above 0; without a unit of its own it has that of the values."
    )
    upper_limit: Line | None = Field(
        None,
        description="Column that marks upper limits, `true` or `false` (or 1 and 0). Of such a row the likelihood is "
        "Phi((value - model)/sigma), the chance that a measurement stays below the limit. Default: none.",
    )
    position_unit: Line | None = Field(
        None,
        description="Unit of the positions, `radii` allowed. "
        + UNIT_WORDS
        + "`_km`, `_m`, `_radii`, `_arcsec`, `_deg`.",
    )
    value_unit: Line | None = Field(
        None,
        description="Unit of the values. "
        + UNIT_WORDS
        + "`_rayleigh`, `_R`, `_kR`, `_m2`, `_cm2` (per area).",
    )
    quantity: Literal["column", "brightness"] = Field(description="What was measured.")
    line: Line | None = Field(None, description="Emission line of the product; goes with a brightness.")
    along: Literal["downtail", "altitude", "slit"] = Field(
        description="What positions count. `downtail`: from the body's centre away from the Sun, in the sky. "
        "`altitude`: of the tangent point over the limb on one `side`. `slit`: along a straight line in the sky."
    )
    side: Side | None = Field(
        None, description="On which side of the body `altitude` counts, as seen in the sky."
    )
    offset: SkyPlace = Field(
        Quantity(0.0, "km"),
        description="How far the profile lies beside the axis of `downtail`, to the left of the way it runs.",
    )
    through: tuple[SkyPlace, SkyPlace] | None = Field(
        None,
        description="Where position 0 of a `slit` lies, from the body's centre to the viewer's right and upwards. "
        "Default: the centre.",
    )
    direction: Angle | None = Field(
        None, description="Direction of a `slit`, from the viewer's right towards up."
    )

    @model_validator(mode="after")
    def _says_what_its_axis_needs(self) -> "ProfileTable":
        for key, axis in (("side", "altitude"), ("direction", "slit")):
            given = getattr(self, key) is not None
            if given != (self.along == axis):
                words = (
                    f'missing; along = "{axis}" needs it'
                    if not given
                    else f'goes with along = "{axis}" alone'
                )
                raise conflict(key, words)
        for key, axis in (("offset", "downtail"), ("through", "slit")):
            if key in self.model_fields_set and self.along != axis:
                raise conflict(key, f'goes with along = "{axis}" alone')
        return self

    @model_validator(mode="after")
    def _names_a_line_of_light(self) -> "ProfileTable":
        if (self.line is None) == (self.quantity == "brightness"):
            words = "missing; a brightness needs it" if self.line is None else "goes with a brightness alone"
            raise conflict("line", words)
        return self

    @model_validator(mode="after")
    def _names_each_column_once(self) -> "ProfileTable":
        used: dict[str, str] = {}
        for key in ("position", "value", "sigma", "upper_limit"):
            name = getattr(self, key)
            if name is not None and (first := used.setdefault(name, key)) != key:
                raise conflict(key, f'"{name}" is already the column of {first}')
        return self
