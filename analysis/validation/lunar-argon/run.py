"""The night of lunar argon for two energies of desorption."""

import sys
from pathlib import Path

import xarray as xr

from tracer.engine.runspec.load import load_run
from tracer.engine.tracing import run

RUN_FILE = Path(__file__).parents[3] / "runs" / "moon-argon.toml"
MORE = (
    "ensemble.particles_per_batch=40",
    "ensemble.seed=5",
    "grid.latitude_cells=18",
    "grid.local_time_cells=96",
)
ENERGIES = ("0.29 eV", "0.32 eV")
BAND = 30.0
"""Low latitudes [deg]."""
HOURS = (0.0, 2.0, 3.0, 4.0, 5.0, 6.0, 9.0, 12.0, 15.0, 18.0, 19.0, 21.0)


def low_latitudes(product: xr.Dataset, name: str) -> xr.DataArray:
    """Return the density of the lowest cells by local time, averaged over low latitudes."""
    ground = product[name].isel(altitude=0).where(abs(product.latitude) < BAND)
    return ground.weighted(product.cell_area).mean("latitude")


def night(by_hour: xr.DataArray) -> xr.DataArray:
    """Return the mean density at 02-04 h over the sunrise peak, the greatest at 05-09 h."""
    hour = by_hour.local_time
    peak = by_hour.where((hour > 5.0) & (hour < 9.0)).max("local_time")
    return by_hour.where((hour > 2.0) & (hour < 4.0)).mean("local_time") / peak


def main() -> int:
    """Trace both, print the profiles and return 0 where the claim holds."""
    profiles, shares = {}, {}
    for energy in ENERGIES:
        settings = (*MORE, f"surface.desorption.energy={energy}")
        product = run(load_run(RUN_FILE, settings)).isel(release=0)
        profiles[energy] = low_latitudes(product, "number_density")
        each = night(low_latitudes(product, "number_density_replicates"))
        shares[energy] = (night(profiles[energy]).item(), float(each.std(ddof=1)) / each.size**0.5)
        at_rest = float((product.adsorbed_column * product.cell_area).sum()) / 1e22 / product.mean_life.item()
        print(f"{energy}: {shares[energy][0]:.2%} +- {shares[energy][1]:.2%} of the sunrise peak at 02-04 h")
        three = profiles[energy].sel(local_time=3.0, method="nearest") / profiles[energy].max()
        print(
            f"         {three.item():.2%} at 03 h; peak at {profiles[energy].idxmax().item():.2f} h; ", end=""
        )
        print(f"{at_rest:.1%} of the mean life, {product.mean_life.item():.3g} s, at rest", flush=True)
    print("density over the greatest, by local time")
    print("hour    " + "  ".join(f"{hour:6.1f}" for hour in HOURS))
    for energy, by_hour in profiles.items():
        row = by_hour.sel(local_time=list(HOURS), method="nearest") / by_hour.max()
        print(f"{energy} " + "  ".join(f"{value:6.3f}" for value in row.values))
    share, error = shares["0.32 eV"]
    fine = share + 4.0 * error < 0.05 and shares["0.29 eV"][0] > shares["0.32 eV"][0]
    print("holds" if fine else "FAILS")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
