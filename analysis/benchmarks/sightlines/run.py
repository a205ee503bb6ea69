"""Seconds for 100,000 lines of sight past the limb of Harrow, on one core."""

import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

ROOT = Path(__file__).parents[3]
"""This checkout: it is what Python imports there, whatever else is installed."""

RAYS = 100_000
RADIUS = 1800.0
"""Of Harrow [km]."""
FEWER = ("ensemble.particles_per_batch=2000", "image[1].pixels=[32, 16]")
FUNCTION = """
import sys, time
import tracer
from astropy.table import Table
from tracer.observe.gas import gas_of
from tracer.observe.sightlines import Options, sightlines_of
rays = Table.read(sys.argv[2], format="ascii.csv")
ds = tracer.open_product(sys.argv[1])
sightlines_of(gas_of(ds), rays[:2], Options())
begin = time.process_time()
gas = gas_of(ds)
ready = time.process_time()
sightlines_of(gas, rays, Options())
print(ready - begin, time.process_time() - ready)
"""


def limb_rays(seed: int) -> np.ndarray:
    """Return rows of observer [km] and tangent point (altitude [km], latitude [deg], local time [h])."""
    random = np.random.default_rng(seed)
    out = random.normal(size=(RAYS, 3))
    observers = 4.0 * RADIUS * out / np.sqrt(np.sum(out**2, axis=1))[:, None]
    latitudes = np.degrees(np.arcsin(random.uniform(-1.0, 1.0, RAYS)))
    return np.column_stack(
        [observers, random.uniform(0.0, 2000.0, RAYS), latitudes, random.uniform(0.0, 24.0, RAYS)]
    )


def timed(command: list[str], environment: dict[str, str]) -> tuple[float, float, str]:
    """Return (seconds by the clock, processor seconds, what was printed) of a command."""
    before, clock = os.times(), time.perf_counter()
    done = subprocess.run(command, check=True, env=environment, cwd=ROOT, capture_output=True, text=True)
    after = os.times()
    spent = after.children_user + after.children_system - before.children_user - before.children_system
    return time.perf_counter() - clock, spent, done.stdout


def main() -> int:
    """Print the table."""
    if hasattr(os, "sched_setaffinity"):
        os.sched_setaffinity(0, {min(os.sched_getaffinity(0))})
    with tempfile.TemporaryDirectory() as folder:
        product, rays, out = (str(Path(folder) / name) for name in ("harrow.nc", "rays.csv", "out.ecsv"))
        np.savetxt(
            rays,
            limb_rays(1),
            delimiter=",",
            comments="",
            header="observer_x_km,observer_y_km,observer_z_km,tangent_altitude_km,tangent_latitude_deg,"
            "tangent_local_time_h",
        )
        environment = {**os.environ, "XDG_CACHE_HOME": folder, "PYTHONPATH": str(ROOT)}
        command = [sys.executable, "-m", "tracer"]
        demo = str(ROOT / "runs" / "harrow-sodium-perihelion.toml")
        changes = [word for change in FEWER for word in ("--set", change)]
        timed([*command, "run", demo, "-o", product, *changes], environment)
        asked = [*command, "sightlines", product, rays, "-o", out, "--overwrite"]
        first = timed(asked, environment)
        second = timed(asked, environment)
        prepared, added = map(
            float, timed([sys.executable, "-c", FUNCTION, product, rays], environment)[2].split()
        )
    print(f"{'':60s} {'seconds':>8s} {'processor':>10s}")
    print(f"{'tracer sightlines, first start (compiles)':60s} {first[0]:8.2f} {first[1]:10.2f}")
    print(f"{'tracer sightlines, second start':60s} {second[0]:8.2f} {second[1]:10.2f}")
    print(f"{'of which reading cells and their slopes':60s} {'':8s} {prepared:10.2f}")
    print(f"{'of which the rays':60s} {'':8s} {added:10.2f}")
    return 0


if __name__ == "__main__":
    sys.exit(main())
