"""Place laws of a release."""

from typing import Annotated, Literal

from pydantic import Field, model_validator

from tracer.engine.runspec.order import is_below
from tracer.inputs.number import Exponent, LocalTime
from tracer.inputs.quantity import Latitude, LengthOrRadii
from tracer.inputs.sky import PlaceDirection
from tracer.inputs.table import NAMED_LAW, Table, conflict
from tracer.inputs.text import FilePath, Line


class Uniform(Table):
    """The same flux from the whole surface."""

    law: Literal["uniform"] = "uniform"


class CosinePower(Table):
    """Flux ~ cos^power of the angle from a direction, zero beyond 90 deg."""

    law: Literal["cosine-power"] = "cosine-power"
    toward: PlaceDirection = Field(description='Where the flux is largest; `"dawn"` is the leading side.')
    power: Exponent = Field(description="Power of the cosine.")


class Patch(Table):
    """The same flux from a round patch, none from elsewhere."""

    law: Literal["patch"] = "patch"
    latitude: Latitude = Field(description="Latitude of the patch's middle.")
    local_time: LocalTime = Field(description="Local time of the patch's middle.")
    radius: LengthOrRadii = Field(description="Radius of the patch along the ground.")


class Band(Table):
    """The same flux from all ground between two latitudes, none from elsewhere."""

    law: Literal["band"] = "band"
    latitude: tuple[Latitude, Latitude] = Field(description="Southern and northern edge.")

    @model_validator(mode="after")
    def _from_south_to_north(self) -> "Band":
        south, north = self.latitude
        if not is_below(south, north):
            raise conflict(
                "latitude", f'["{south}", "{north}"] is no band; the first must be below the second'
            )
        return self


class ReleaseMap(Table):
    """A map of your own: the same flux from all ground of a cell."""

    law: Literal["map"] = "map"
    file: FilePath = Field(
        description="netCDF file with the coordinates `latitude` [deg] and `local_time` [h], the middles of cells that "
        "cover the sphere."
    )
    variable: Line = Field(
        description="Its variable over `latitude` and `local_time`, the flux per area; only ratios count, so in any "
        "unit."
    )


PlaceLaw = Annotated[Uniform | CosinePower | Patch | Band | ReleaseMap, Field(discriminator="law"), NAMED_LAW]
