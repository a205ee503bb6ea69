"""The ground of a scene: what it holds for a while, and where it keeps what lands."""

from collections.abc import Iterator
from math import radians, sin
from typing import NamedTuple

from tracer.constants import ASTRONOMICAL_UNIT
from tracer.engine.laws import speed_law
from tracer.engine.maps import PROBABILITY_MAP, read_map
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.speed import TabulatedSpeed
from tracer.engine.sunlight import Sunlight
from tracer.kernels.surface_map import SurfaceMap
from tracer.physics.release.laws import SpeedLaw
from tracer.units import si


class PhotonDesorption(NamedTuple):
    """Desorption by sunlight: `rate` [s-1] where the Sun stands overhead, and the law of its speeds."""

    rate: float
    speed: SpeedLaw


class Desorption(NamedTuple):
    """How adsorbed atoms leave again: `energy` [J], `attempt_frequency` [s-1], beside it perhaps sunlight."""

    energy: float
    attempt_frequency: float
    photon: PhotonDesorption | None


class ColdTraps(NamedTuple):
    """Places that capture what lands: where |sin(latitude)| is at least `least_sine`, or by a `probability`.

    One of the two is None.
    """

    least_sine: float | None
    probability: SurfaceMap | None


def resolve_desorption(spec: RunSpec, sun: Sunlight | None) -> Desorption | None:
    """Return how adsorbed atoms leave again, None where the ground keeps them for good.

    Raises
    ------
    InputError
        A table of speeds that cannot be used.
    """
    table = spec.surface.desorption
    if table is None:
        return None
    photon = None
    if table.photon is not None and sun is not None:
        dilution = (ASTRONOMICAL_UNIT / sun.station.distance) ** 2
        photon = PhotonDesorption(
            si(table.photon.cross_section) * si(table.photon.photon_flux) * dilution,
            speed_law(spec, "surface.desorption.photon.speed", table.photon.speed),
        )
    return Desorption(si(table.energy), si(table.attempt_frequency), photon)


def resolve_cold_traps(spec: RunSpec) -> ColdTraps | None:
    """Return the places that capture what lands, None where there are none.

    Raises
    ------
    InputError
        A map of probabilities that cannot be used.
    """
    table = spec.surface.cold_traps
    if table is None:
        return None
    if table.poleward_of is not None:
        return ColdTraps(sin(radians(si(table.poleward_of))), None)
    assert table.file is not None
    assert table.variable is not None
    return ColdTraps(None, read_map(spec, "surface.cold_traps", table.file, table.variable, PROBABILITY_MAP))


def ground_files(spec: RunSpec) -> Iterator[str]:
    """Yield the files that `[surface]` refers to for traps and desorption, as the run file writes them."""
    desorption, traps = spec.surface.desorption, spec.surface.cold_traps
    photon = None if desorption is None else desorption.photon
    if photon is not None and isinstance(photon.speed, TabulatedSpeed):
        yield photon.speed.file
    if traps is not None and traps.file is not None:
        yield traps.file
