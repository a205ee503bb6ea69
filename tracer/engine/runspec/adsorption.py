"""[surface]: what becomes of atoms that the ground holds."""

from pydantic import Field, model_validator

from tracer.engine.runspec.speed import SpeedLaw
from tracer.inputs.quantity import Area, Energy, Frequency, PhotonFlux, PolarAngle
from tracer.inputs.table import Table, conflict
from tracer.inputs.text import FilePath, Line


class PhotonDesorptionTable(Table):
    """Desorption by sunlight: cross section times photon flux times the cosine of the solar zenith angle, by day."""

    cross_section: Area = Field(description="Cross section of one adsorbed atom.")
    photon_flux: PhotonFlux = Field(
        description="Photons that desorb, at 1 au; they go with the inverse square."
    )
    speed: SpeedLaw = Field(description="Distribution of the speeds of atoms that sunlight desorbs.")


class DesorptionTable(Table):
    """How long adsorbed atoms stay: exp(E/kT)/frequency at one temperature."""

    energy: Energy = Field(description="Energy of desorption E, of one atom or per mole.")
    attempt_frequency: Frequency = Field(description="Attempts to leave, per second.")
    photon: PhotonDesorptionTable | None = Field(
        None, description="Desorption by sunlight beside that by heat; needs `[sun]`."
    )


class ColdTrapsTable(Table):
    """Places that keep whatever lands there: by `poleward_of`, or by `file` and `variable`."""

    poleward_of: PolarAngle | None = Field(
        None, description="Latitude, north and south, poleward of which every landing is captured."
    )
    file: FilePath | None = Field(
        None, description="netCDF file of a map over latitude and local time, the middles of its cells."
    )
    variable: Line | None = Field(
        None, description="Variable of the map: probability of capture at each landing."
    )

    @model_validator(mode="after")
    def _is_one_of_two(self) -> "ColdTrapsTable":
        by_map = self.file is not None or self.variable is not None
        if self.poleward_of is not None and by_map:
            key = "file" if self.file is not None else "variable"
            raise conflict(key, "stands beside poleward_of; must be one of the two")
        if self.poleward_of is None and not by_map:
            raise conflict(
                "poleward_of", 'missing; either this or file and variable; write for example "85 deg"'
            )
        for key in ("file", "variable") if by_map else ():
            if getattr(self, key) is None:
                raise conflict(key, "missing; a map needs file and variable")
        return self
