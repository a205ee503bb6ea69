"""[view], [slit], [seeing]: from where, through what opening and through what air the profile was seen."""

from typing import Literal

from pydantic import Field, model_validator

from tracer.inputs.quantity import Length
from tracer.inputs.sky import ViewerDirection
from tracer.inputs.table import Table, conflict
from tracer.inputs.text import Line
from tracer.observe.observationspec.fields import MoffatPower, PhaseAngle, SkyWidth, TurnOrWord


class ViewTable(Table):
    """Where the observer stands, so far away that all lines of sight are parallel."""

    look_from: ViewerDirection | None = Field(
        None, description="Where the viewer stands, as an image of a run file has it."
    )
    phase_angle: PhaseAngle | None = Field(
        None, description="Angle Sun - body - observer, in place of `look_from`."
    )
    side: Literal["dusk", "dawn", "north", "south"] = Field(
        "dusk", description="On which side of the line to the Sun the observer of a `phase_angle` stands."
    )
    image: Line | None = Field(
        None, description="Name of the image of this view, where a product has several. Default: the finest."
    )
    distance: Length | None = Field(
        None,
        description="Of the observer from the body; needed where a length in the sky is given as an angle.",
    )

    @model_validator(mode="after")
    def _has_one_direction(self) -> "ViewTable":
        if self.look_from is None and self.phase_angle is None:
            raise conflict("look_from", "missing; must be given, or phase_angle in its place")
        if self.look_from is not None and self.phase_angle is not None:
            raise conflict("phase_angle", "look_from is given as well; must be one of the two")
        if "side" in self.model_fields_set and self.phase_angle is None:
            raise conflict("side", "goes with phase_angle alone")
        return self


class SlitTable(Table):
    """The rectangle over which each point of the profile is a mean: a slit, or one bin along it."""

    width: SkyWidth = Field(description="Short side, at right angles to `length`.")
    length: SkyWidth = Field(description="Other side; of a slit that is read out in bins, that of one bin.")
    orientation: TurnOrWord = Field(
        "along",
        description='How `length` lies: `"along"` the profile, `"across"` it, or an angle from the way it runs, '
        "turned from the viewer's right towards up.",
    )


class SeeingTable(Table):
    """How a point of light is spread, by the air or the optics."""

    fwhm: SkyWidth = Field(description="Full width at half maximum.")
    profile: Literal["gaussian", "moffat"] = Field(
        "gaussian", description="Shape: a Gaussian, or a Moffat function, whose wings reach farther."
    )
    beta: MoffatPower | None = Field(
        None, description="Power of a Moffat function, (1 + r^2/a^2)^-beta; required with it."
    )

    @model_validator(mode="after")
    def _has_a_power_for_its_wings(self) -> "SeeingTable":
        if (self.beta is None) == (self.profile == "moffat"):
            words = "missing; a Moffat function needs it" if self.beta is None else 'goes with "moffat" alone'
            raise conflict("beta", words)
        return self
