"""The resolved scene of a product in sentences, from its own run file and attributes."""

from collections.abc import Iterator, Mapping
from math import nan
from numbers import Real
from typing import Any

import numpy as np
import xarray as xr

from tracer.catalogue.photo_rates import photo_rates
from tracer.constants import ASTRONOMICAL_UNIT
from tracer.physics.thermal import escape_speed, jeans_parameter, surface_gravity
from tracer.plots.page.law_words import (
    DIRECTIONS,
    GROUNDS,
    PLACES,
    SPEEDS,
    STICKING,
    adsorbed_words,
    law_words,
    shown,
    trap_words,
)
from tracer.plots.page.reading import duration, number
from tracer.plots.run_text import atom_mass, body_gm, rotation_period, run_tables
from tracer.product.layout import LINE
from tracer.product.run_file import Table, entries, table, value

KILOMETRE = 1e3


def scene_words(product: xr.Dataset) -> Iterator[tuple[str, str]]:
    """Yield what a sentence is about, and the sentence."""
    run = run_tables(product)
    if not run:
        yield "Scene", "The product's run file cannot be read, so its scene is not known here."
        return
    radius = _known(product.attrs, "body_radius") or nan
    yield "Body and gas", _body(run, radius)
    if "host" in product.attrs:
        yield "Host", _host(run, product.attrs)
    yield "Sunlight", _sunlight(run, product.attrs, LINE in product.dims)
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
    yield "Sample", _ensemble(run, product.attrs)


def release_jeans(run: Table, entry: Table, radius: float) -> float | None:
    """Return the jeans parameter of a release of one temperature, None for others."""
    speed, mass, gm = table(entry, "speed"), atom_mass(run), body_gm(run)
    kelvin = value(speed, "temperature", "temperature")
    if not kelvin or not mass or not gm or not radius > 0.0:
        return None
    return jeans_parameter(gm, radius, kelvin, mass)


def _body(run: Table, radius: float) -> str:
    name, species = table(run, "body").get("name", "?"), table(run, "gas").get("species", "?")
    if name == "Moon":
        name = "the Moon"
    words = f"{species} over {name}, a smooth sphere of radius {number(radius / KILOMETRE)} km"
    gm = body_gm(run)
    if gm:
        words += (
            f", surface gravity {number(surface_gravity(gm, radius))} m s\N{SUPERSCRIPT MINUS}\N{SUPERSCRIPT TWO}, "
            f"escape speed {number(escape_speed(gm, radius) / KILOMETRE)} km/s"
        )
    elif gm == 0.0:
        words += ", without gravity"
    host = table(table(run, "body"), "host")
    if "host" in table(run, "body") and host.get("rotation", "locked") == "locked":
        return words + ". The ground keeps the same face to the host."
    period = rotation_period(run)
    if period is None:
        return words + ". The ground does not turn."
    return words + f". The ground turns once in {duration(period)} among the stars."


def _host(run: Table, attributes: Mapping[Any, Any]) -> str:
    """Return what is near a moon; `host_position` [m] has three numbers, in a product as out of a file."""
    words = f"{attributes['host']}, a sphere"
    radius, angle = _known(attributes, "host_radius"), _known(attributes, "phase_angle")
    place = np.atleast_1d(np.asarray(attributes.get("host_position", ()), dtype=np.float64))
    if radius is not None:
        words += f" of radius {number(radius / KILOMETRE)} km"
    if place.size == 3:
        words += f", {number(float(np.linalg.norm(place)) / KILOMETRE)} km away"
    if angle is not None:
        words += f", at a phase angle of {number(angle)} deg (0 full moon, 180 new moon, seen from the host)"
    if _moves(run):
        words += "; the moon goes round it while atoms fly, and this is its stated position"
    else:
        words += "; it keeps its place while atoms fly, in a frame that turns as the moon goes round it"
    return words + ". It pulls, shades, and ends the flight of what hits it."


def _sunlight(run: Table, attributes: Mapping[Any, Any], shines: bool) -> str:
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
    stands = (
        "it travels on its orbit while atoms fly, and this is its stated position"
        if _moves(run)
        else "it stays there while atoms fly"
    )
    push = gas.get("radiation_acceleration", "lines" if shines else "none")
    pushes = {
        "lines": "that of the lines with known g, Doppler-shifted",
        "none": "none",
    }.get(str(push), f"{shown(push)} at 1 au")
    return (
        f"{words}; {stands}. The Sun's tide {tide}. Push of sunlight: {pushes}. "
        f"Photo-ionisation: {_ionization(gas)}. Shadow: {shown(sun.get('shadow', 'penumbra'))}. "
        f"Solar activity {shown(sun.get('solar_activity', 0.0))} (0 quiet, 1 active)."
    )


def _ionization(gas: Table) -> str:
    rate = gas.get("photoionization_rate")
    if rate is None:
        return (
            "the catalogue's rate" if str(gas.get("species")) in photo_rates() else "none, no rate is known"
        )
    return "none" if value(gas, "photoionization_rate", "rate") == 0.0 else f"{shown(rate)} at 1 au"


def _release(run: Table, entry: Table, radius: float) -> str:
    words = (
        f"{_rate(run, entry)}; speeds: {law_words(table(entry, 'speed'), SPEEDS)}; directions: "
        f"{law_words(table(entry, 'direction'), DIRECTIONS)}; places: {law_words(table(entry, 'place'), PLACES)}."
    )
    jeans = release_jeans(run, entry, radius)
    return words if jeans is None else f"{words} Jeans parameter {number(jeans, 3)}."


def _moves(run: Table) -> bool:
    return bool(table(run, "sun").get("motion", "stationary") == "moving")


def _rate(run: Table, entry: Table) -> str:
    follows = _moves(run) and entry.get("rate_scaling", "constant") == "inverse-square"
    return f"{shown(entry.get('rate', '?'))} new atoms" + (" at the stated position" if follows else "")


def _loss(loss: Table) -> str:
    scaling = (
        "at 1 au, falling with the square of the distance" if loss.get("scaling") == "inverse-square" else ""
    )
    where = "in sunlight" if loss.get("where") == "sunlight" else "everywhere"
    return f"{' '.join(filter(None, [shown(loss.get('rate', '?')), scaling]))}, {where}."


def _surface(run: Table) -> str:
    surface = table(run, "surface")
    sticking = surface.get("sticking", 0.0)
    if sticking == 0.0:
        words = [f"Every atom that returns bounces, {_accommodation(surface)}."]
    elif sticking == 1.0:
        words = [f"Every atom that returns is adsorbed {adsorbed_words(surface)}."]
    elif isinstance(sticking, Real):
        words = [
            f"An atom that returns is adsorbed with probability {shown(sticking)} {adsorbed_words(surface)}."
        ]
    else:
        law = law_words(table(surface, "sticking"), STICKING)
        words = [f"An atom that returns is adsorbed {law}, {adsorbed_words(surface)}."]
    if sticking not in (0.0, 1.0):
        words.append(f"Others bounce, {_accommodation(surface)}.")
    ground = table(surface, "temperature")
    if ground:
        words.append(f"Temperature of the ground: {law_words(ground, GROUNDS)}.")
    traps = table(surface, "cold_traps")
    if traps:
        words.append(f"Cold traps: {trap_words(traps)}.")
    return " ".join(words)


def _accommodation(surface: Table) -> str:
    return f"with an energy accommodation of {shown(surface.get('accommodation', 1.0))}"


def _domain(run: Table) -> str:
    domain = table(run, "domain")
    outer = shown(domain.get("outer_radius", "the Hill radius"))
    return (
        f"Atoms are followed to {outer} from the centre, where they count as escaped, and for at most "
        f"{shown(domain.get('age_limit', '1 yr'))}."
    )


def _grid(run: Table) -> str:
    grid, heights = table(run, "grid"), table(table(run, "grid"), "altitude")
    return (
        f"{shown(heights.get('cells', '?'))} layers from a first of {shown(heights.get('first_cell', '?'))} up to "
        f"{shown(heights.get('top', '?'))} altitude, {shown(grid.get('latitude_cells', '?'))} latitudes, "
        f"{shown(grid.get('local_time_cells', '?'))} local times."
    )


def _ensemble(run: Table, attributes: Mapping[Any, Any]) -> str:
    batches, particles, flights = (
        shown(attributes.get(key, "?")) for key in ("batches", "particles_per_batch", "flights")
    )
    seed = attributes.get("seed", "?")
    words = f"{batches} batches of {particles} particles for each release, {flights} flights, seed {seed}."
    if table(run, "ensemble").get("emphasis", "even") == "far":
        words += " Half of the launches, with less weight each, are those that reach far."
    return words


def _known(attributes: Mapping[Any, Any], key: str) -> float | None:
    found = attributes.get(key)
    return float(found) if isinstance(found, Real) else None
