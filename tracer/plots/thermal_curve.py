"""Where a release makes Chamberlain's exosphere, and the curve to draw beside its profile."""

from math import pi
from typing import NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.physics.chamberlain import base_density, density_ratio
from tracer.physics.thermal import jeans_parameter, most_probable_speed
from tracer.plots.run_text import atom_mass, body_gm, rotation_period, run_tables
from tracer.product.run_file import Table, entries, table, value

SLOW_GROUND = 0.01
"""Speed of the ground over the most probable speed below which launches count as those from a body at rest: the
density then differs by the square of it."""


class ThermalCurve(NamedTuple):
    """A release with Chamberlain's profile: its jeans parameter and the density [m-3] at the ground, n_c."""

    jeans: float
    base: float

    def density(self, radii: NDArray[np.float64]) -> NDArray[np.float64]:
        """Return the density [m-3] at distances in body radii, at least 1."""
        return self.base * density_ratio(self.jeans, radii)


def thermal_curve(product: xr.Dataset, release: str, radius: float) -> ThermalCurve | None:
    """Return the curve of a release, None where Chamberlain's conditions do not hold.

    They are: gravity alone, a release spread evenly over a ground that (nearly) stands still, a flux-weighted
    Maxwellian of one temperature by the cosine law, and every returning atom captured.

    Parameters
    ----------
    product : xarray.Dataset
        With its run file.
    release : str
        Name of the release.
    radius : float
        Of the body [m].
    """
    run = run_tables(product)
    entry = next((one for one in entries(run, "release") if one.get("name") == release), None)
    mass, gm = atom_mass(run), body_gm(run)
    if entry is None or mass is None or not gm or not _gravity_alone(run) or not _even(entry):
        return None
    kelvin, rate = _temperature(run, entry), value(entry, "rate", "rate")
    if not kelvin or not rate or table(run, "surface").get("sticking", 0.0) != 1.0:
        return None
    period = rotation_period(run)
    if period and 2.0 * pi * radius / period > SLOW_GROUND * most_probable_speed(kelvin, mass):
        return None
    flux = rate / (4.0 * pi * radius**2)
    return ThermalCurve(jeans_parameter(gm, radius, kelvin, mass), base_density(flux, kelvin, mass))


def _gravity_alone(run: Table) -> bool:
    losses = entries(table(run, "gas"), "loss")
    return "sun" not in run and all(value(one, "rate", "rate") == 0.0 for one in losses)


def _even(entry: Table) -> bool:
    direction, speed = table(entry, "direction"), table(entry, "speed")
    cosine = direction.get("law", "cosine") == "cosine" and direction.get("power", 1.0) == 1.0
    place = table(entry, "place").get("law", "uniform")
    return cosine and place == "uniform" and speed.get("law") == "maxwell-flux"


def _temperature(run: Table, entry: Table) -> float | None:
    speed = table(entry, "speed")
    if speed.get("temperature") != "surface":
        return value(speed, "temperature", "temperature")
    ground = table(table(run, "surface"), "temperature")
    return value(ground, "value", "temperature") if ground.get("law") == "uniform" else None
