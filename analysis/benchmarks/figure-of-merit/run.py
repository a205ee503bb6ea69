"""Figures of merit 1/(relative variance x processor time): stratified and far launches over independent ones."""

import argparse
import platform
import sys
from collections.abc import Callable
from pathlib import Path
from time import process_time
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

import tracer
from tracer.engine.batches import Task, Work, make_work, trace_batch
from tracer.engine.emphasis import with_emphasis
from tracer.engine.scene import Scene, build_scene
from tracer.kernels.scoring import Tally
from tracer.tally.axes import middles
from tracer.tally.buffer import plane_shape, plane_size, tally_views

Floats = NDArray[np.float64]

HERE = Path(__file__).parent
HARROW = HERE.parents[2] / "runs" / "harrow-sodium-perihelion.toml"
SAMPLINGS = ("independent", "even", "far")
PARTICLES = 20_000
SEED = 20310601
CELLS_OF_NOTE = 0.2
"""Cells that hold at least this part of their region's mean count for the mean over cells."""

RESAMPLES = 400
SCENES = {
    "sunlight": "Mercury sodium 1,200 K at true anomaly 60 deg",
    "gravity": "the same under gravity alone",
    "harrow": "Harrow sodium 1,200 K",
}
GOALS = {
    ("sunlight", "tail"): ("far", "sum", 5.0),
    ("sunlight", "high"): ("far", "sum", 5.0),
    ("gravity", "high"): ("far", "sum", 100.0),
    ("sunlight", "column"): ("even", "cells", 1.5),
}
"""What is asked for: scene and region; sampling, of the region's sum or of its cells, least ratio."""


class Sums(NamedTuple):
    """Over batches: what each region holds, lists of numbers, and sums and sums of squares of its cells."""

    regions: dict[str, list[float]]
    cells: dict[str, Floats]
    squares: dict[str, Floats]
    seconds: list[float]


def regions(scene: Scene) -> dict[str, Callable[[Tally], Floats]]:
    """Return what is looked at: atoms in pixels of the tail, in high cells, in day-side columns, and what escapes."""
    radius = scene.body.radius
    high = middles(scene.grid.altitude_edges) > 3.0 * radius
    day = np.abs(middles(scene.grid.local_time_edges) - 12.0) < 6.0
    plane = scene.planes[0]
    far = middles(plane.horizontal_edges) < -15.0 * radius
    return {
        "tail": lambda tally: (
            tally.image_content[: plane_size(plane)].reshape(plane_shape(plane))[:, far].ravel()
        ),
        "high": lambda tally: tally.content[high].ravel(),
        "column": lambda tally: tally.column_content[:, day].ravel(),
        "escape": lambda tally: tally.ledger[1:2],
    }


def works(scene: Scene) -> dict[str, Work]:
    """Return the same work with each way to draw launches."""
    even = make_work(scene._replace(emphasis="even", releases=scene.releases[:1]), SEED, PARTICLES)
    far = make_work(even.scene._replace(emphasis="far"), SEED, PARTICLES)
    return {"independent": even._replace(stratified=False), "even": even, "far": with_emphasis(far)}


def measure(scene: Scene, batches: int, more: int) -> dict[str, Sums]:
    """Trace `batches` batches of every sampling in turn; `more` times as many of independent launches."""
    looks = regions(scene)
    sums = {name: Sums({r: [] for r in looks}, {}, {}, []) for name in SAMPLINGS}
    found = works(scene)
    for work in found.values():
        _trace(work, 0)
    for batch in range(batches * more):
        for name in SAMPLINGS[: 3 if batch < batches else 1]:
            begin = process_time()
            tally = _trace(found[name], batch)
            sums[name].seconds.append(process_time() - begin)
            for region, look in looks.items():
                _add(sums[name], region, look(tally))
    return sums


def _trace(work: Work, batch: int) -> Tally:
    result = trace_batch(work, Task(0, batch), lambda _atoms, _flights: None, lambda: False)
    return tally_views(work.layout, result.buffer)


def _add(sums: Sums, region: str, cells: Floats) -> None:
    sums.regions[region].append(float(cells.sum()))
    sums.cells[region] = sums.cells.get(region, 0.0) + cells
    sums.squares[region] = sums.squares.get(region, 0.0) + cells**2


def cost_of_error(sums: Sums, region: str, mean: float) -> tuple[float, float]:
    """Return (relative variance of a region's sum x seconds a batch, its relative error by resampling).

    `mean` is the best known mean of the sum.
    """
    values = np.array(sums.regions[region])
    seconds = float(np.mean(sums.seconds))
    rng = np.random.default_rng(1)
    scattered = [values[rng.integers(0, len(values), len(values))].var(ddof=1) for _ in range(RESAMPLES)]
    variance = values.var(ddof=1)
    if variance == 0.0:
        return np.nan, np.nan
    return variance / mean**2 * seconds, float(np.std(scattered) / variance)


def cost_of_cells(sums: Sums, region: str, means: Floats) -> float:
    """Return the mean over a region's cells of note of (relative variance) x seconds a batch."""
    count = len(sums.regions[region])
    mean = sums.cells[region] / count
    variance = (sums.squares[region] / count - mean**2) * count / (count - 1)
    of_note = means > CELLS_OF_NOTE * means.mean()
    found = float((variance[of_note] / means[of_note] ** 2).mean())
    return found * float(np.mean(sums.seconds)) if found > 0.0 else np.nan


def report(title: str, scene_name: str, sums: dict[str, Sums]) -> list[str]:
    """Print the ratios of one scene and return the goals that are missed."""
    missed = []
    spent = {name: np.mean(one.seconds) / PARTICLES * 1e6 for name, one in sums.items()}
    counts = {name: len(one.seconds) for name, one in sums.items()}
    print(
        f"\n{title}: microseconds a launch, bounces included: "
        + ", ".join(f"{n} {t:.2f}" for n, t in spent.items())
    )
    print("batches: " + ", ".join(f"{name} {count}" for name, count in counts.items()))
    print(f"{'region':10s}{'sampling':12s} {'of its sum':>12s} {'+-':>9s} {'of its cells':>12s}   goal")
    far = sums["far"]
    for region in sums["even"].regions:
        mean, cells = float(np.mean(far.regions[region])), far.cells[region] / len(far.seconds)
        if mean == 0.0:
            continue
        reference, reference_error = cost_of_error(sums["independent"], region, mean)
        reference_cells = cost_of_cells(sums["independent"], region, cells)
        for name in ("even", "far"):
            cost, error = cost_of_error(sums[name], region, mean)
            ratio = reference / cost
            cell_ratio = reference_cells / cost_of_cells(sums[name], region, cells)
            sampling, what, least = GOALS.get((scene_name, region), ("", "", 0.0))
            reached = {"sum": ratio, "cells": cell_ratio}.get(what, 0.0) >= least
            goal = "" if sampling != name else f"{what} {least:g}: {'reached' if reached else 'MISSED'}"
            if "MISSED" in goal:
                missed.append(f"{title}, {region}")
            print(
                f"{region:10s}{name:12s} {ratio:12.4g} {ratio * np.hypot(error, reference_error):9.2g} "
                f"{cell_ratio:12.3g}   {goal}"
            )
    return missed


def main() -> int:
    """Trace, print, and say which goals are missed."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--batches", type=int, default=400, help="batches of each sampling (default 400)")
    parser.add_argument(
        "--gravity-factor", type=int, default=10, help="as many more of independent launches there"
    )
    parser.add_argument(
        "--scene",
        choices=SCENES,
        action="append",
        help="only this one (default: all)",
    )
    arguments = parser.parse_args()
    print("machine:", platform.processor() or platform.machine(), platform.platform())
    print("load of the machine:", Path("/proc/loadavg").read_text(encoding="ascii").strip())
    spec = tracer.load_run(HERE / "case.toml")
    run_files = {
        "sunlight": spec,
        "gravity": spec.model_copy(update={"sun": None}),
        "harrow": tracer.load_run(HARROW),
    }
    missed = []
    for name in arguments.scene or SCENES:
        more = arguments.gravity_factor if name == "gravity" else 1
        missed += report(SCENES[name], name, measure(build_scene(run_files[name]), arguments.batches, more))
    print("\nmissed: " + "; ".join(missed) if missed else "\nall goals reached")
    return int(bool(missed))


if __name__ == "__main__":
    sys.exit(main())
