"""How gas that only bounces spreads over ground of uneven temperature: more of it where it is cold."""

import sys
import tempfile
from pathlib import Path

import netCDF4
import numpy as np
import xarray as xr

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.engine.runspec.load import load_run
from tracer.engine.tracing import run
from tracer.tally.axes import direction

BATCHES = 20
PARTICLES = 60
DISCARDED, WHOLE = 1e6, 5e6
"""Ages [s] at which the record begins and ends: the distribution over the sphere has to settle first."""
FIRST_CELL = 4e3
GRAVITY = 4902.8e9 / 1737.4e3**2
MASS = 39.9623831 * ATOMIC_MASS
RUN = """
title = "Argon that only bounces"
body = {{ name = "Moon at rest", radius = "1737.4 km", gm = "4902.8 km3 s-2" }}
gas = {{ species = "Ar" }}
domain = {{ outer_radius = "1000 radii", age_limit = "{age} s" }}
ensemble = {{ particles_per_batch = {particles}, batches = {batches}, replicates = {batches}, seed = {seed} }}
[grid]
altitude = {{ first_cell = "4 km", top = "100 km", cells = 2 }}
latitude_cells = 60
local_time_cells = 120
[[release]]
name = "uniform"
rate = "1e24 s-1"
speed = {{ law = "maxwell-flux", temperature = "surface" }}
[surface]
temperature = {{ law = "map", file = "kelvin.nc", variable = "kelvin" }}
"""


def kelvin(cosine: np.ndarray) -> np.ndarray:
    """Return the temperature [K] at a cosine of the solar zenith angle."""
    return 250.0 + 100.0 * cosine


def write_map(path: Path) -> None:
    """Write the temperatures of cells of one degree and four minutes."""
    latitudes, hours = np.arange(-89.5, 90.0), (np.arange(360) + 0.5) / 15.0
    with netCDF4.Dataset(path, "w") as file:
        for name, middles in (("latitude", latitudes), ("local_time", hours)):
            file.createDimension(name, len(middles))
            file.createVariable(name, "f8", (name,))[:] = middles
        cosines = np.array([[direction(latitude, hour)[0] for hour in hours] for latitude in latitudes])
        values = file.createVariable("kelvin", "f8", ("latitude", "local_time"))
        values[:] = kelvin(cosines)
        values.units = "K"


def recorded(folder: Path, age: float, particles: int, seed: int) -> xr.Dataset:
    """Return the product of all ages up to `age`."""
    path = folder / "argon.toml"
    path.write_text(RUN.format(age=age, particles=particles, batches=BATCHES, seed=seed), encoding="utf-8")
    return run(load_run(path)).isel(release=0)


def main() -> int:
    """Trace, compare at both ends and return 0 where the law holds."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        write_map(folder / "kelvin.nc")
        settling = recorded(folder, DISCARDED, 4 * PARTICLES, 1)
        both = recorded(folder, WHOLE, PARTICLES, 2)
    places = [
        [direction(latitude, hour)[0] for hour in both.local_time.values] for latitude in both.latitude.values
    ]
    cosine = xr.DataArray(np.array(places), dims=("latitude", "local_time"))
    hops = both.mean_flights.item() - settling.mean_flights.item()
    print(f"{hops:.0f} hops on the record of each atom, {both.attrs['flights']:,} hops altogether")
    # Products are linear: what counts after the settling is the difference.
    launches = both.return_flux - settling.return_flux
    ground = (both.number_density - settling.number_density).isel(altitude=0)
    height = BOLTZMANN * kelvin(cosine) / (MASS * GRAVITY)
    # From the lowest cell's mean to the ground, by the barometer.
    density = ground * (FIRST_CELL / height) / -np.expm1(-FIRST_CELL / height)
    rows = []
    for low in np.arange(-1.0, 1.0, 0.1):
        band = (cosine >= low - 1e-9) & (cosine < low + 0.1 - 1e-9)
        area = both.cell_area.where(band)
        weights = area / area.sum()
        rows.append((low + 0.05, float((launches * weights).sum()), float((density * weights).sum())))
    middle, flux, gas = np.array(rows).T
    # Bands are noisy and the law is smooth: a parabola of the logarithm against that of the temperature.
    print("cos(zenith angle)   launches   density   (over those at +0.95)")
    for row in range(len(middle)):
        print(f"{middle[row]:12.2f} {flux[row] / flux[-1]:14.3f} {gas[row] / gas[-1]:9.3f}")
    fine = True
    for word, values, expected in (("launches", flux, 5.62), ("density", gas, 8.38)):
        fit = np.polynomial.Polynomial.fit(np.log(kelvin(middle)), np.log(values), 2, w=np.sqrt(values))
        found = float(np.exp(fit(np.log(kelvin(-0.95))) - fit(np.log(kelvin(0.95)))))
        off = found / expected - 1.0
        fine = fine and abs(off) < 0.04
        print(
            f"{word}: expected {expected}, ends {values[0] / values[-1]:.3f}, fitted {found:.3f}, off {off:+.2%}"
        )
    print("holds" if fine else "FAILS")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
