"""What drawing launches costs by law, and which part of a batch's time goes to anything but its flights."""

import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.engine.batches import BLOCK, Task, compile_kernels, make_work, trace_batch
from tracer.engine.emphasis import with_emphasis
from tracer.engine.launching import make_launches
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import Release, Scene, build_scene
from tracer.kernels.surface_map import SurfaceMap
from tracer.physics.release.direction.cosine import Cosine
from tracer.physics.release.even_numbers import EvenNumbers
from tracer.physics.release.place.band import Band
from tracer.physics.release.place.cosine_power import CosinePower
from tracer.physics.release.place.flux_map import flux_map
from tracer.physics.release.place.patch import Patch
from tracer.physics.release.place.uniform import Uniform
from tracer.physics.release.speed.maxwell_flux import MaxwellFlux
from tracer.physics.release.speed.maxwell_gas import MaxwellGas
from tracer.physics.release.speed.sigmund_thompson import SigmundThompson
from tracer.physics.release.speed.single import Single
from tracer.physics.release.speed.table import Table
from tracer.physics.release.strata import Strata, draw, one_stratum

RUN_FILE = Path(__file__).parents[3] / "runs" / "moon-sodium-gravity.toml"
REPEATS = 20
PARTICLES = 400_000
"""A batch of about a second."""
ELECTRONVOLT = 1.602176634e-19
SODIUM = 23.0 * ATOMIC_MASS


def tabulated() -> Table:
    """Return a flux-weighted Maxwellian of 1,200 K at 200 speeds."""
    speed = np.linspace(0.0, 6000.0, 200)
    return Table(speed, speed**3 * np.exp(-0.5 * SODIUM * speed**2 / (BOLTZMANN * 1200.0)))


def mapped() -> SurfaceMap:
    """Return a map of 2 degrees."""
    latitudes, hours = np.linspace(-89.0, 89.0, 90), (np.arange(180) + 0.5) * 24.0 / 180.0
    return SurfaceMap(latitudes, hours, np.random.default_rng(1).random((90, 180)))


SUN = (1.0, 0.0, 0.0)
SPEEDS = {
    "maxwell-flux": MaxwellFlux(1200.0),
    "maxwell-flux, ground's temperature": MaxwellFlux(None),
    "maxwell-gas": MaxwellGas(1200.0),
    "sigmund-thompson": SigmundThompson(2.0 * ELECTRONVOLT, 2020.75 * ELECTRONVOLT),
    "table of 200 speeds": tabulated(),
    "single": Single(1000.0),
}
PLACES = {
    "uniform": Uniform(),
    "cosine-power 1": CosinePower(SUN, 1.0),
    "cosine-power 2": CosinePower(SUN, 2.0),
    "patch": Patch(SUN, 0.4),
    "band": Band(-20.0, 50.0),
    "map of 90 x 180": flux_map(mapped()),
}


def nanoseconds(work: Callable[[], object]) -> tuple[float, float]:
    """Return the least and the median processor time [ns] of `work` per launch of a block."""
    work()
    times = []
    for _ in range(REPEATS):
        begin = time.thread_time()
        work()
        times.append(time.thread_time() - begin)
    return min(times) / BLOCK * 1e9, float(np.median(times)) / BLOCK * 1e9


def print_launches(name: str, scene: Scene, release: Release, strata: Strata) -> None:
    """Print what a launch of `release` costs."""
    supply = EvenNumbers(np.random.default_rng(1))

    def launches() -> object:
        u, shares = draw(strata, supply, 0, BLOCK)
        return make_launches(scene, release, u, shares)

    print(f"{name:50s} {'{:8.1f} {:8.1f}'.format(*nanoseconds(launches))}", flush=True)


def beyond_kernels(scene: Scene) -> float:
    """Return the part of batches' processor time that is not the kernels'."""
    work = make_work(scene, 1, PARTICLES)
    compile_kernels(work)
    begin, inside = time.thread_time(), 0.0
    for release in range(len(scene.releases)):
        inside += trace_batch(
            work, Task(release, 0), lambda _atoms, _flights: None, lambda: False
        ).kernel_seconds
    return 1.0 - inside / (time.thread_time() - begin)


def main() -> int:
    """Print the table and say whether the criterion is met."""
    scene = build_scene(load_run(RUN_FILE))
    release = scene.releases[0]._replace(place=Uniform(), direction=Cosine(1.0))
    print(f"{'processor time of a launch [ns]':50s} {'least':>8s} {'median':>8s}")
    for name, speed in SPEEDS.items():
        print_launches(f"speed: {name}", scene, release._replace(speed=speed), one_stratum(BLOCK))
    for name, place in PLACES.items():
        print_launches(f"place: {name}", scene, release._replace(place=place), one_stratum(BLOCK))
    far = with_emphasis(make_work(scene._replace(emphasis="far"), 1, BLOCK)).strata
    for one, strata in zip(scene.releases, far, strict=True):
        print_launches(f"{one.name}, as it is", scene, one, one_stratum(BLOCK))
        print_launches(f"{one.name}, far, {len(strata.counts)} boxes", scene, one, strata)
    part = beyond_kernels(scene)
    print(f"part of a batch's processor time beyond kernels: {100.0 * part:.1f} %")
    return int(part > 0.06)


if __name__ == "__main__":
    sys.exit(main())
