"""What share of the Moon's water reaches polar cold traps before it is lost, against an independent Monte Carlo."""

import sys
from math import hypot
from pathlib import Path

from tracer.engine.runspec.load import load_run
from tracer.engine.tracing import run

RUN_FILE = Path(__file__).parents[3] / "runs" / "moon-water-traps.toml"
MORE = (
    "ensemble.particles_per_batch=4000",
    "ensemble.seed=4",
    "grid.latitude_cells=6",
    "grid.local_time_cells=6",
)
EXPECTED_ERROR = 0.0015
CASES = (
    ("250 K", "85 deg", 0.2314, 121.0),
    ("250 K", "80 deg", 0.3981, 95.4),
    ("392 K", "85 deg", 0.2311, 84.7),
)


def main() -> int:
    """Compare, print the table and return 0 where all hold."""
    fine = True
    print("ground  traps beyond    captured expected            traced   errors    hops expected   traced")
    for kelvin, latitude, share, hops in CASES:
        settings = (f"surface.temperature.value={kelvin}", f"surface.cold_traps.poleward_of={latitude}")
        product = run(load_run(RUN_FILE, (*MORE, *settings))).isel(release=0)
        rate = float(product.release_flux.dot(product.cell_area).sum())
        found = product.ledger.sel(fate="captured").item() / rate
        error = product.ledger_standard_error.sel(fate="captured").item() / rate
        sigmas = (found - share) / hypot(error, EXPECTED_ERROR)
        flights = product.mean_flights.item()
        fine = fine and abs(sigmas) < 4.0 and abs(flights / hops - 1.0) < 0.01
        print(
            f"{kelvin:7s} {latitude:13s} {share:18.4f} {found:9.4f} +- {error:.4f} {sigmas:8.2f} {hops:16.1f} "
            f"{flights:8.2f}",
            flush=True,
        )
    print("holds" if fine else "FAILS")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
