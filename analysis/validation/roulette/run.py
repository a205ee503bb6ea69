"""Roulette and survival weights: unbiased against analog atoms, and what each threshold is worth."""

import sys
from pathlib import Path
from typing import NamedTuple

import numpy as np

from tracer.engine.batches import Task, Work, make_work, trace_batch
from tracer.engine.launching import draw_launches
from tracer.engine.runspec.load import load_run, parse_run
from tracer.engine.scene import build_scene
from tracer.fate import Fate
from tracer.kernels.launches import Launches
from tracer.kernels.resume import new_resume
from tracer.kernels.roulette import OFF, WEIGHTED, Roulette
from tracer.kernels.scoring import Tally
from tracer.kernels.tracing import trace_slice
from tracer.tally.buffer import tally_views

RUNS = Path(__file__).parents[3] / "runs"
BATCHES, PARTICLES = 400, 100
RUN = """
title = "Helium over Harrow"
body = { name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2", rotation_period = "4 d" }
gas = { species = "He", loss = [{ name = "loss", rate = "2e-4 s-1" }] }
domain = { outer_radius = "6 radii", age_limit = "2 d" }
grid = { altitude = { first_cell = "100 km", top = "3 radii", cells = 3 }, latitude_cells = 3, local_time_cells = 4 }
[[release]]
name = "ground"
rate = "1e24 s-1"
speed = { law = "maxwell-flux", temperature = "surface" }
[surface]
temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }
sticking = 0.02
accommodation = 0.7
"""
SUNLIT = RUN.replace("[surface]", '[sun]\ndistance = "0.1 au"\n[surface]').replace(
    'loss = [{ name = "loss", rate = "2e-4 s-1" }]', 'photoionization_rate = "2e-6 s-1"'
)
EARLY = Roulette(on_ground=0.7, aloft=0.8, gain=2.0)
BOUNCING = (0.0, 0.003, 0.01, 0.03, 0.1, 0.3, 0.7)
FLYING = (0.0, 0.001, 0.003, 0.01, 0.03, 0.1)


class Traced(NamedTuple):
    """Buffers of many batches, (batches, size), and the steps, or else flights, that a batch took."""

    buffers: np.ndarray
    cost: float


def traced(work: Work, roulette: Roulette, batches: int, first: int = 0) -> Traced:
    """Trace batches with a roulette of one's own."""
    work = work._replace(world=work.world._replace(roulette=roulette))
    done = [
        trace_batch(work, Task(0, first + i), lambda _atoms, _flights: None, lambda: False)
        for i in range(batches)
    ]
    return Traced(
        np.array([one.buffer for one in done]), sum(one.steps or one.flights for one in done) / batches
    )


def analog(work: Work, batches: int) -> np.ndarray:
    """Return the buffers of atoms that are whole until the moment, drawn beforehand, at which the loss takes them."""
    motion = work.world.motion
    result = np.zeros((batches, work.layout.size))
    for batch in range(batches):
        rng = np.random.default_rng(10_000 + batch)
        tally = tally_views(work.layout, result[batch])
        release = work.scene.releases[0]
        launches = draw_launches(work.scene, release, work.particles, rng, release.rate / work.particles)
        for i, age in enumerate(rng.exponential(1.0 / motion.hazard, work.particles)):
            own = motion._replace(hazard=0.0, age_limit=float(min(age, motion.age_limit)))
            world = work.world._replace(motion=own, roulette=OFF)
            before = tally.ledger[Fate.AGE_LIMIT]
            trace_slice(
                world, Launches(*(part[i : i + 1] for part in launches)), new_resume(0), tally, rng, 10**9
            )
            if age < motion.age_limit:
                tally.ledger[Fate.OTHER_LOSS] += tally.ledger[Fate.AGE_LIMIT] - before
                tally.ledger[Fate.AGE_LIMIT] = before
    return result


def deviations(one: np.ndarray, other: np.ndarray) -> np.ndarray:
    """Return the differences of means in standard errors, of fields that scatter and are hit in most batches."""
    hit = ((one != 0.0).mean(axis=0) > 0.5) & ((other != 0.0).mean(axis=0) > 0.5)
    a, b = one[:, hit], other[:, hit]
    variance = a.var(axis=0, ddof=1) / len(a) + b.var(axis=0, ddof=1) / len(b)
    open_ = variance > 1e-20 * a.mean(axis=0) ** 2
    return (a.mean(axis=0) - b.mean(axis=0))[open_] / np.sqrt(variance[open_])


def is_unbiased() -> bool:
    """Print the greatest deviations over all fields and return whether all stay below 4.5 standard errors."""
    fine = True
    arcs, lit = (make_work(build_scene(parse_run(text, "harrow")), 7, PARTICLES) for text in (RUN, SUNLIT))
    whole = analog(arcs, BATCHES)
    plain = traced(lit, OFF, BATCHES, first=BATCHES).buffers
    for word, roulette in (
        ("weights alone", OFF),
        ("as in all runs", WEIGHTED),
        ("played all the time", EARLY),
    ):
        for scene, work, against in (
            ("arcs against analog", arcs, whole),
            ("sunlit against weights", lit, plain),
        ):
            found = deviations(traced(work, roulette, BATCHES).buffers, against)
            fine = fine and float(np.abs(found).max()) < 4.5
            print(
                f"{word:20s} {scene:24s} {len(found):4d} fields: greatest {np.abs(found).max():5.2f}, mean "
                f"{found.mean():+5.2f}, mean square {(found**2).mean():5.2f}",
                flush=True,
            )
    return fine


def relative_variance(values: np.ndarray) -> float:
    """Return the median over fields of the variance of a batch over its squared mean."""
    hit = (values != 0.0).mean(axis=0) > 0.5
    values = values[:, hit]
    return float(np.median(values.var(axis=0, ddof=1) / values.mean(axis=0) ** 2))


def fields(tally: Tally) -> dict[str, np.ndarray]:
    """Return the groups of fields that are judged."""
    return {
        "density": tally.content.ravel(),
        "landings": tally.returned.ravel(),
        "life": tally.life,
        "image": tally.image_content.ravel(),
    }


def worth(work: Work, roulette: Roulette, batches: int, far: np.ndarray | None) -> dict[str, float]:
    """Return 1 over (relative variance times cost) of each group of fields."""
    done = traced(work, roulette, batches)
    rows: dict[str, list[np.ndarray]] = {}
    for buffer in done.buffers:
        for name, values in fields(tally_views(work.layout, buffer)).items():
            rows.setdefault(name, []).append(values)
    groups = {name: np.array(each) for name, each in rows.items()}
    image = groups.pop("image")
    if far is not None:
        groups["far tail"] = image[:, far]
    return {name: 1.0 / (relative_variance(values) * done.cost) for name, values in groups.items()}


def print_worth(
    title: str, work: Work, choices: list[Roulette], batches: int, far: np.ndarray | None
) -> None:
    """Print the figures of merit over those of weights alone, the first choice."""
    print(f"\n{title}: figures of merit over those without roulette")
    base: dict[str, float] = {}
    for roulette in choices:
        found = worth(work, roulette, batches, far)
        base = base or found
        row = "  ".join(f"{name} {found[name] / base[name]:6.2f}" for name in found)
        print(f"ground {roulette.on_ground:5.3f} aloft {roulette.aloft:5.3f}: {row}", flush=True)


def main() -> int:
    """Compare, print the tables and return 0 where nothing is biased."""
    fine = is_unbiased()
    small = ("grid.latitude_cells=6", "grid.local_time_cells=8", "grid.altitude.cells=6")
    bouncing = load_run(
        RUNS / "harrow-helium.toml", (*small, "gas.loss[1].rate=3e-5 s-1", "domain.age_limit=10 d")
    )
    work = make_work(build_scene(bouncing), 3, 20)
    print_worth("helium that bounces", work, [Roulette(one, 0.01, 2.0) for one in BOUNCING], 100, None)
    pixels = ("image[1].pixels=[20, 8]", "domain.age_limit=5 d", "gas.photoionization_rate=5.9e-5 s-1")
    tail = load_run(RUNS / "harrow-sodium-perihelion.toml", (*small, *pixels))
    work = make_work(build_scene(tail), 3, 300)
    column = np.arange(160).reshape(8, 20)[2:6, :5].ravel()
    print_worth(
        "sodium tail, ten times as frail", work, [Roulette(0.1, one, 2.0) for one in FLYING], 100, column
    )
    print("holds" if fine else "FAILS")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
