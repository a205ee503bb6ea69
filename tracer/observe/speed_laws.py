"""Laws of launch speed as a profile's fit or a caller names them, as laws with a density."""

from collections.abc import Callable, Mapping
from types import MappingProxyType
from typing import Any

import numpy as np

from tracer.errors import InputError
from tracer.physics.release.laws import SpeedDensity
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.physics.release.speed.maxwell_gas import MaxwellGas
from tracer.physics.release.speed.sigmund_thompson import SigmundThompson
from tracer.physics.release.speed.table import Table
from tracer.units import parse, quoted, si

SpeedLawWords = Mapping[str, Any]

LAWS = ("maxwell-flux", "maxwell-gas", "sigmund-thompson", "table")


def speed_density(law: SpeedLawWords | SpeedDensity) -> SpeedDensity:
    """Return the law that is meant.

    Parameters
    ----------
    law : mapping or SpeedDensity
        A law of `tracer.physics.release.speed`, or the words of the run file: `law` beside `temperature` [K], or
        `binding_energy` and `cutoff_energy` [J]; numbers are in SI, text has a unit. A `table` has `speed` [m s-1] and
        `pdf`, each (n,).

    Raises
    ------
    InputError
        An unknown law, a missing, unknown or impossible value, or a law that has no density or takes the ground's
        temperature.
    """
    if not isinstance(law, Mapping):
        if not hasattr(law, "density"):
            raise InputError(
                f"the speed law {type(law).__name__} has no density; responses serve {_listed(LAWS)}"
            )
        if getattr(law, "temperature", 0.0) is None:
            raise InputError(
                "temperature: the ground's own cannot be evaluated from responses; give it in kelvin"
            )
        return law
    name = law.get("law")
    if name not in LAWS:
        raise InputError(f"law: {quoted(name)} cannot be evaluated from responses; allowed: {_listed(LAWS)}")
    keys, make = _MAKERS[name]
    wrong = [
        *(key for key in law if key != "law" and key not in keys),
        *(key for key in keys if key not in law),
    ]
    if wrong:
        problem = "unknown key" if wrong[0] in law else "missing"
        raise InputError(f"{wrong[0]}: {problem}; {name} takes {_listed(keys)}")
    return make(law)


def _positive(law: SpeedLawWords, key: str, dimension: str) -> float:
    given = law[key]
    try:
        value = si(parse(given, dimension)) if isinstance(given, str) else float(given)
    except (TypeError, ValueError) as error:
        raise InputError(f"{key}: {error}") from None
    if not 0.0 < value < np.inf:
        raise InputError(f"{key}: {quoted(given)} is out of range; must be above 0")
    return value


def _sigmund_thompson(law: SpeedLawWords) -> SpeedDensity:
    binding, cutoff = (_positive(law, key, "energy") for key in ("binding_energy", "cutoff_energy"))
    # Nearer to the binding energy the distribution cannot be told from rounding.
    if not cutoff > 1.0001 * binding:
        raise InputError(
            f"cutoff_energy: {cutoff:g} J is too low; must be above binding_energy, {binding:g} J"
        )
    return SigmundThompson(binding, cutoff)


def _table(law: SpeedLawWords) -> SpeedDensity:
    try:
        speed, pdf = (np.asarray(law[key], dtype=np.float64) for key in ("speed", "pdf"))
    except (TypeError, ValueError):
        raise InputError("speed, pdf: must be two lists of numbers") from None
    if speed.ndim != 1 or speed.shape != pdf.shape or len(speed) < 2:
        raise InputError("speed, pdf: must be two lists of the same length, at least 2")
    rises = speed[0] >= 0.0 and bool(np.all(np.diff(speed) > 0.0)) and np.isfinite(speed[-1])
    if not rises:
        raise InputError("speed: must be finite and rise from 0 m/s or above")
    if not (np.all(pdf >= 0.0) and np.isfinite(pdf).all() and pdf.any()):
        raise InputError("pdf: must be finite, at least 0, and not 0 everywhere")
    return Table(speed, pdf)


_MAKERS: Mapping[str, tuple[tuple[str, ...], Callable[[SpeedLawWords], SpeedDensity]]] = MappingProxyType(
    {
        "maxwell-flux": (
            ("temperature",),
            lambda law: MaxwellFlux(_positive(law, "temperature", "temperature")),
        ),
        "maxwell-gas": (
            ("temperature",),
            lambda law: MaxwellGas(_positive(law, "temperature", "temperature")),
        ),
        "sigmund-thompson": (("binding_energy", "cutoff_energy"), _sigmund_thompson),
        "table": (("speed", "pdf"), _table),
    }
)


def _listed(words: tuple[str, ...]) -> str:
    return ", ".join(words)
