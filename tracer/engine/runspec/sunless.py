"""What gas and ground cannot have without [sun]: settings that would have no effect are refused."""

from collections.abc import Iterator

from tracer.engine.runspec.gas import GasTable
from tracer.engine.runspec.surface import SurfaceTable
from tracer.engine.runspec.temperature import Conduction, EquilibriumTemperature
from tracer.inputs.table import conflict
from tracer.units import Quantity

_NO_LIGHT = "needs [sun]; without it there is no light"
_NO_DISTANCE = "needs [sun]; without it there is no distance from the Sun"


def dead_without_sun(gas: GasTable) -> Iterator[Exception]:
    """Yield a conflict for each setting of `[gas]` that only sunlight could bring to life."""
    rate, push = gas.photoionization_rate, gas.radiation_acceleration
    if rate is not None and rate.value != 0.0:
        yield conflict("gas.photoionization_rate", f'"{rate}" {_NO_LIGHT}; must be left out or "0 s-1"')
    if isinstance(push, Quantity) or push == "lines":
        yield conflict("gas.radiation_acceleration", f'"{push}" {_NO_LIGHT}; must be left out or "none"')
    for number, line in enumerate(gas.line, 1):
        yield conflict(f"gas.line[{number}]", f'"{line.name}" {_NO_LIGHT}')
    for number, loss in enumerate(gas.loss, 1):
        if loss.scaling == "inverse-square":
            yield conflict(
                f"gas.loss[{number}].scaling", f'"{loss.scaling}" {_NO_DISTANCE}; must be "constant"'
            )
        if loss.where == "sunlight":
            yield conflict(f"gas.loss[{number}].where", f'"{loss.where}" {_NO_LIGHT}; must be "everywhere"')


def unheated_without_sun(surface: SurfaceTable) -> Iterator[Exception]:
    """Yield a conflict where the ground's temperature follows from sunlight, or sunlight frees what it holds."""
    law = surface.temperature
    if isinstance(law, EquilibriumTemperature | Conduction):
        yield conflict("surface.temperature", f'"{law.law}" {_NO_DISTANCE}')
    if surface.desorption is not None and surface.desorption.photon is not None:
        yield conflict("surface.desorption.photon", _NO_LIGHT)
