"""Laws of a run file in words; a law without words of its own is shown by its keys."""

from collections.abc import Callable, Mapping
from numbers import Integral, Real
from typing import Any

from tracer.plots.page.reading import count, number, quantity
from tracer.product.run_file import Table, table

Words = Mapping[str, Callable[[Table], str]]


def law_words(law: Table, words: Words) -> str:
    """Return a law in words; one without words of its own as its name, keys and values."""
    told = words.get(str(law.get("law")))
    if told is None:
        return f"by the law {listed(law)}" if law else "not stated"
    return told(law)


def listed(law: Table) -> str:
    """Return the name of a law and its keys with their values."""
    told = (shown(entry) if key == "law" else f"{key} {shown(entry)}" for key, entry in law.items())
    return ", ".join(told) or "not stated"


def shown(entry: Any) -> str:
    """Return any value of a run file as people read it."""
    if isinstance(entry, dict):
        return f"({listed(entry)})"
    if isinstance(entry, list):
        return " to ".join(map(shown, entry))
    if isinstance(entry, bool) or not isinstance(entry, Real):
        return quantity(str(entry))
    return count(int(entry)) if isinstance(entry, Integral) else number(float(entry))


def _temperature(law: Table) -> str:
    kelvin = law.get("temperature")
    return "of the ground's temperature" if kelvin == "surface" else f"of {shown(kelvin)}"


def _toward(place: Any) -> str:
    if isinstance(place, dict):
        return f"latitude {shown(place.get('latitude'))}, local time {shown(place.get('local_time'))} h"
    return {"sun": "the subsolar point", "dawn": "the dawn point, which leads"}.get(str(place), str(place))


def _map(law: Table) -> str:
    return f"the map {shown(law.get('variable'))} of {shown(law.get('file'))}"


def _albedo(law: Table) -> str:
    return f"albedo {shown(law.get('albedo'))}, emissivity {shown(law.get('emissivity'))}"


def _heat(law: Table) -> str:
    if "thermal_inertia" in law:
        return f"thermal inertia {shown(law['thermal_inertia'])}"
    return (
        f"conductivity {shown(law.get('conductivity'))}, density {shown(law.get('density'))}, heat capacity "
        f"{shown(law.get('heat_capacity'))}"
    )


SPEEDS: Words = {
    "maxwell-flux": lambda t: f"flux-weighted Maxwellian {_temperature(t)}",
    "maxwell-gas": lambda t: f"Maxwellian of a gas at rest {_temperature(t)}",
    "single": lambda t: f"{shown(t.get('speed'))}, all alike",
    "sigmund-thompson": lambda t: (
        f"sputtering (Sigmund and Thompson), binding energy {shown(t.get('binding_energy'))}, "
        f"cut-off {shown(t.get('cutoff_energy'))}"
    ),
    "table": lambda t: f"table {shown(t.get('file'))}",
}
DIRECTIONS: Words = {
    "cosine": lambda t: (
        "cosine law" if t.get("power", 1.0) == 1.0 else f"cosine to the power {shown(t['power'])}"
    ),
    "isotropic": lambda _: "alike into the half space",
    "normal": lambda _: "straight up",
}
PLACES: Words = {
    "uniform": lambda _: "all over the surface",
    "cosine-power": lambda t: (
        f"cosine of the angle from {_toward(t.get('toward'))}, to the power {shown(t.get('power', 1.0))}"
    ),
    "patch": lambda t: (
        f"a patch of radius {shown(t.get('radius'))} at latitude {shown(t.get('latitude'))}, local time "
        f"{shown(t.get('local_time'))} h"
    ),
    "band": lambda t: f"latitudes {shown(t.get('latitude'))}",
    "map": _map,
}
GROUNDS: Words = {
    "uniform": lambda t: f"{shown(t.get('value'))} everywhere",
    "quarter-power": lambda t: (
        f"{shown(t.get('subsolar'))} under the Sun, falling with the fourth root of the cosine of the solar zenith "
        f"angle to {shown(t.get('night'))} at night"
    ),
    "equilibrium": lambda t: (
        f"ground that radiates the sunlight it absorbs ({_albedo(t)}), nowhere below {shown(t.get('night'))}"
    ),
    "hurley-2015": lambda _: "a fit to observed temperatures of the Moon (Hurley et al. 2015)",
    "map": _map,
    "conduction": lambda t: f"ground that conducts heat and radiates ({_heat(t)}, {_albedo(t)})",
}
STICKING: Words = {
    "exponential": lambda t: (
        f"with probability {shown(t.get('value'))} on ground of {shown(t.get('at'))}, less by a factor e for every "
        f"{shown(t.get('e_folding'))} above that"
    ),
}


def adsorbed_words(surface: Table) -> str:
    """Return what becomes of adsorbed atoms, as the end of a sentence."""
    if surface.get("adsorbed", "captured") == "captured":
        return "and then captured for good"
    desorption = table(surface, "desorption")
    held = (
        "and leaves again after its residence time, exp(E/kT)/frequency with "
        f"E = {shown(desorption.get('energy', '?'))} and a frequency of "
        f"{shown(desorption.get('attempt_frequency', '?'))}"
    )
    freed = desorption.get("photon")
    if not isinstance(freed, dict):
        return held
    return (
        f"{held}, or when sunlight frees it (cross section {shown(freed.get('cross_section', '?'))}, "
        f"{shown(freed.get('photon_flux', '?'))} photons at 1 au)"
    )


def trap_words(traps: Table) -> str:
    """Return where cold traps lie."""
    if "poleward_of" in traps:
        return f"all ground poleward of {shown(traps['poleward_of'])} keeps what lands there"
    return f"{_map(traps)} is the probability that what lands is kept"
