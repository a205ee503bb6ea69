"""Differences between two runs with other seeds along the same lines of sight, in units of their standard errors."""

import sys
from itertools import pairwise
from pathlib import Path

import numpy as np

import tracer

RUN = Path(__file__).parents[3] / "runs" / "harrow-sodium-perihelion.toml"
SEEDS = (20310601, 77)
RAYS = 8000
LAYERS = (0.0, 20.0, 100.0, 300.0, 800.0, 2000.0)
"""Ends of layers of tangent altitude [km]."""
QUANTITIES = ("column{}_m2", "brightness_na_d2{}_rayleigh", "brightness_na_d1{}_rayleigh")
ALLOWED = (0.9, 1.2)
"""Root mean square of the differences: 1.03 for 38 degrees of freedom, and rays beside each other are no two."""


def rays() -> dict[str, np.ndarray]:
    """Return random lines of sight past the limb, seen from four radii."""
    random = np.random.default_rng(1)
    out = random.normal(size=(3, RAYS))
    observers = 7200.0 * out / np.sqrt(np.sum(out**2, axis=0))
    return {
        **dict(zip(("observer_x_km", "observer_y_km", "observer_z_km"), observers, strict=True)),
        "tangent_altitude_km": LAYERS[-1] * random.random(RAYS),
        "tangent_latitude_deg": np.degrees(np.arcsin(random.uniform(-1.0, 1.0, RAYS))),
        "tangent_local_time_h": random.uniform(0.0, 24.0, RAYS),
    }


def main() -> int:
    """Print the table and return 0 where every root mean square is allowed."""
    looks = rays()
    tables = []
    for seed in SEEDS:
        changes = [f"ensemble.seed={seed}", "ensemble.particles_per_batch=2000", "image[1].pixels=[8, 4]"]
        tables.append(tracer.sightlines(tracer.run(tracer.load_run(RUN, changes)), looks))
    good = True
    print(
        f"{'quantity':28s} {'altitude km':>12s} {'rays':>6s} {'rms':>6s} {'mean':>7s} {'relative error':>15s}"
    )
    for quantity in QUANTITIES:
        value, error = quantity.format(""), quantity.format("_standard_error")
        spread = np.sqrt(sum(np.asarray(table[error]) ** 2 for table in tables))
        z = (np.asarray(tables[0][value]) - np.asarray(tables[1][value])) / spread
        relative = np.asarray(tables[0][error]) / np.asarray(tables[0][value])
        for low, high in pairwise(LAYERS):
            layer = (looks["tangent_altitude_km"] >= low) & (looks["tangent_altitude_km"] < high)
            rms = float(np.sqrt(np.mean(z[layer] ** 2)))
            good = good and ALLOWED[0] <= rms <= ALLOWED[1]
            print(
                f"{value:28s} {low:5.0f}-{high:<6.0f} {layer.sum():6d} {rms:6.2f} {z[layer].mean():+7.2f} "
                f"{100.0 * np.median(relative[layer]):14.1f}%"
            )
    print("holds" if good else "FAILS")
    return 0 if good else 1


if __name__ == "__main__":
    sys.exit(main())
