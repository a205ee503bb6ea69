"""The resolved scene of a product in sentences, from its own run file and attributes."""

from collections.abc import Callable, Iterator, Mapping
from math import nan
from numbers import Integral, Real
from typing import Any

import xarray as xr

from tracer.constants import ASTRONOMICAL_UNIT
from tracer.physics.thermal import escape_speed, jeans_parameter, surface_gravity
from tracer.plots.page.reading import count, duration, number, quantity
from tracer.plots.run_text import (
    Table,
    atom_mass,
    body_gm,
    entries,
    rotation_period,
    run_tables,
    table,
    value,
)

KILOMETRE = 1e3


def scene_words(product: xr.Dataset) -> Iterator[tuple[str, str]]:
    """Yield what a sentence is about, and the sentence."""
    run = run_tables(product)
    if not run:
        yield "Scene", "The product's run file cannot be read, so its scene is not known here."
        return
    radius = _known(product.attrs, "body_radius") or nan
    yield "Body and gas", _body(run, radius)
    yield "Sunlight", _sunlight(run, product.attrs)
    for entry in entries(run, "release"):
        yield (
            f"Release \N{LEFT DOUBLE QUOTATION MARK}{entry.get('name')}\N{RIGHT DOUBLE QUOTATION MARK}",
            _release(run, entry, radius),
        )
    for loss in entries(table(run, "gas"), "loss"):
        yield (
            f"Loss \N{LEFT DOUBLE QUOTATION MARK}{loss.get('name')}\N{RIGHT DOUBLE QUOTATION MARK}",
            _loss(loss),
        )
    yield "Surface", _surface(run)
    yield "Traced space", _domain(run)
    yield "Grid", _grid(run)
    yield "Sample", _ensemble(product.attrs)


def release_jeans(run: Table, entry: Table, radius: float) -> float | None:
    """Return the jeans parameter of a release of one temperature, None for others."""
    speed, mass, gm = table(entry, "speed"), atom_mass(run), body_gm(run)
    kelvin = value(speed, "temperature", "temperature")
    if not kelvin or not mass or not gm or not radius > 0.0:
        return None
    return jeans_parameter(gm, radius, kelvin, mass)


def _body(run: Table, radius: float) -> str:
    name, species = table(run, "body").get("name", "?"), table(run, "gas").get("species", "?")
    words = f"{species} over {name}, a smooth sphere of radius {number(radius / KILOMETRE)} km"
    gm = body_gm(run)
    if gm:
        words += (
            f", surface gravity {number(surface_gravity(gm, radius))} m s\N{SUPERSCRIPT MINUS}\N{SUPERSCRIPT TWO}, "
            f"escape speed {number(escape_speed(gm, radius) / KILOMETRE)} km/s"
        )
    elif gm == 0.0:
        words += ", without gravity"
    period = rotation_period(run)
    if period is None:
        return words + ". The ground does not turn."
    return words + f". The ground turns once in {duration(period)} among the stars."


def _sunlight(run: Table, attributes: Mapping[Any, Any]) -> str:
    if "sun" not in run:
        return (
            "None: gravity alone, no push, no tide, no light. The direction +x still counts as that of the Sun "
            "in local times and views."
        )
    sun, gas = table(run, "sun"), table(run, "gas")
    words = "The body stands"
    distance, anomaly = _known(attributes, "sun_distance"), _known(attributes, "true_anomaly")
    if distance is not None:
        words += f" {number(distance / ASTRONOMICAL_UNIT)} au from the Sun"
    if anomaly is not None:
        words += f" at a true anomaly of {number(anomaly)} deg"
    if "epoch" in sun:
        words += f" (epoch {sun['epoch']})"
    speed = (_known(attributes, "sun_radial_velocity") or 0.0) / KILOMETRE
    way = "recedes from it at" if speed > 0.0 else "approaches it at"
    words += f" and {way} {number(abs(speed))} km/s" if speed else ""
    tide = "acts" if sun.get("tide", True) else "is switched off"
    motion = sun.get("motion", "stationary")
    stands = (
        "stays there while atoms fly"
        if motion == "stationary"
        else "moves on along its orbit while atoms fly"
    )
    push = gas.get("radiation_acceleration", "lines")
    pushes = {
        "lines": "that of the lines with known g, Doppler-shifted",
        "none": "none",
    }.get(str(push), f"{_shown(push)} at 1 au")
    return (
        f"{words}; it {stands}. The Sun's tide {tide}. Push of sunlight: {pushes}. "
        f"Shadow: {_shown(sun.get('shadow', 'penumbra'))}. Solar activity {_shown(sun.get('solar_activity', 0.0))} "
        "(0 quiet, 1 active)."
    )


def _release(run: Table, entry: Table, radius: float) -> str:
    words = (
        f"{_shown(entry.get('rate', '?'))} new atoms; speeds: {_law(table(entry, 'speed'), SPEEDS)}; directions: "
        f"{_law(table(entry, 'direction'), DIRECTIONS)}; places: {_law(table(entry, 'place'), PLACES)}."
    )
    jeans = release_jeans(run, entry, radius)
    return words if jeans is None else f"{words} Jeans parameter {number(jeans, 3)}."


def _loss(loss: Table) -> str:
    scaling = (
        "at 1 au, falling with the square of the distance" if loss.get("scaling") == "inverse-square" else ""
    )
    where = "in sunlight" if loss.get("where") == "sunlight" else "everywhere"
    return f"{' '.join(filter(None, [_shown(loss.get('rate', '?')), scaling]))}, {where}."


def _surface(run: Table) -> str:
    surface = table(run, "surface")
    sticking, adsorbed = surface.get("sticking", 0.0), surface.get("adsorbed", "captured")
    words = []
    if isinstance(sticking, Real):
        words.append(f"A returning atom is adsorbed with probability {_shown(sticking)}")
    else:
        words.append(f"A returning atom is adsorbed by the law {_listed(table(surface, 'sticking'))}")
    words.append("and then captured for good." if adsorbed == "captured" else "and leaves again later.")
    if sticking != 1.0:
        accommodation = surface.get("accommodation", 1.0)
        words.append(f"Others bounce with an energy accommodation of {_shown(accommodation)}.")
    ground = table(surface, "temperature")
    if ground:
        words.append(f"Temperature of the ground: {_law(ground, GROUNDS)}.")
    if surface.get("cold_traps"):
        words.append(f"Cold traps: {_listed(table(surface, 'cold_traps'))}.")
    return " ".join(words)


def _domain(run: Table) -> str:
    domain = table(run, "domain")
    outer = _shown(domain.get("outer_radius", "the Hill radius"))
    return (
        f"Atoms are followed to {outer} from the centre, where they count as escaped, and for at most "
        f"{_shown(domain.get('age_limit', '1 yr'))}."
    )


def _grid(run: Table) -> str:
    grid, heights = table(run, "grid"), table(table(run, "grid"), "altitude")
    return (
        f"{_shown(heights.get('cells', '?'))} layers from a first of {_shown(heights.get('first_cell', '?'))} up to "
        f"{_shown(heights.get('top', '?'))} altitude, {_shown(grid.get('latitude_cells', '?'))} latitudes, "
        f"{_shown(grid.get('local_time_cells', '?'))} local times."
    )


def _ensemble(attributes: Mapping[Any, Any]) -> str:
    batches, particles, flights = (
        _shown(attributes.get(key, "?")) for key in ("batches", "particles_per_batch", "flights")
    )
    seed = attributes.get("seed", "?")
    return f"{batches} batches of {particles} particles for each release, {flights} flights, seed {seed}."


SPEEDS: dict[str, Callable[[Table], str]] = {
    "maxwell-flux": lambda t: f"flux-weighted Maxwellian {_temperature(t)}",
    "maxwell-gas": lambda t: f"Maxwellian of a gas at rest {_temperature(t)}",
    "single": lambda t: f"{_shown(t.get('speed'))}, all alike",
    "sigmund-thompson": lambda t: (
        f"sputtering (Sigmund and Thompson), binding energy {_shown(t.get('binding_energy'))}, "
        f"cut-off {_shown(t.get('cutoff_energy'))}"
    ),
    "table": lambda t: f"table {_shown(t.get('file'))}",
}
DIRECTIONS: dict[str, Callable[[Table], str]] = {
    "cosine": lambda t: (
        "cosine law" if t.get("power", 1.0) == 1.0 else f"cosine to the power {_shown(t['power'])}"
    ),
    "isotropic": lambda _: "alike into the half space",
    "normal": lambda _: "straight up",
}
PLACES: dict[str, Callable[[Table], str]] = {
    "uniform": lambda _: "all over the surface",
    "cosine-power": lambda t: (
        f"cosine of the angle from {_toward(t.get('toward'))}, to the power {_shown(t.get('power', 1.0))}"
    ),
    "patch": lambda t: (
        f"a patch of radius {_shown(t.get('radius'))} at latitude {_shown(t.get('latitude'))}, local time "
        f"{_shown(t.get('local_time'))} h"
    ),
    "band": lambda t: f"latitudes {_shown(t.get('latitude'))}",
}
GROUNDS: dict[str, Callable[[Table], str]] = {
    "uniform": lambda t: f"{_shown(t.get('value'))} everywhere",
    "quarter-power": lambda t: (
        f"{_shown(t.get('subsolar'))} under the Sun, falling with the fourth root of the cosine of the solar zenith "
        f"angle to {_shown(t.get('night'))} at night"
    ),
}


def _law(law: Table, words: Mapping[str, Callable[[Table], str]]) -> str:
    """Return a law in words; one without words of its own as its keys and values."""
    told = words.get(str(law.get("law")))
    return _listed(law) if told is None else told(law)


def _listed(law: Table) -> str:
    return ", ".join(f"{key} {_shown(entry)}" for key, entry in law.items()) or "not stated"


def _shown(entry: Any) -> str:
    if isinstance(entry, dict):
        return f"({_listed(entry)})"
    if isinstance(entry, list):
        return " to ".join(map(_shown, entry))
    if isinstance(entry, bool) or not isinstance(entry, Real):
        return quantity(str(entry))
    return count(int(entry)) if isinstance(entry, Integral) else number(float(entry))


def _known(attributes: Mapping[Any, Any], key: str) -> float | None:
    found = attributes.get(key)
    return float(found) if isinstance(found, Real) else None


def _temperature(law: Table) -> str:
    kelvin = law.get("temperature")
    return "of the ground's temperature" if kelvin == "surface" else f"of {_shown(kelvin)}"


def _toward(place: Any) -> str:
    if isinstance(place, dict):
        return f"latitude {place.get('latitude')}, local time {_shown(place.get('local_time'))} h"
    return {"sun": "the subsolar point", "dawn": "the dawn point, which leads"}.get(str(place), str(place))
