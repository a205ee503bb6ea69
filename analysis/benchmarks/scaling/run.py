"""Seconds and memory against particles, two workers against one, and what a cluster of local processes costs."""

import argparse
import os
import platform
import sys
import tempfile
from importlib.util import find_spec
from pathlib import Path
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

import tracer

ROOT = Path(__file__).parents[3]
RUN_FILES = {"arcs": "moon-sodium-gravity.toml", "integrated": "mercury-sodium.toml"}
BATCHES = 20
BATCHES_SIDE_BY_SIDE = 12
"""Batches a release of the runs that are compared: one worker may have nothing to do while the other ends the last, so
that of few batches two workers cannot take half the time."""

TRIES = 3
"""Runs of all but the most particles, in turn, of which the fastest counts."""

STOLEN = 8
"""Place of stolen time in the first line of the system's table."""

MOST_DEVIATION = 0.10
LEAST_SPEED_UP = 1.85
MOST_CLUSTER_OVERHEAD = 0.05


class Run(NamedTuple):
    """Wall and kernel `seconds` of a run by its product, and the largest memory [MB] of its process.

    `stolen` are the processors' seconds that a host of virtual machines gave to others meanwhile.
    """

    seconds: float
    kernel: float
    memory: float
    stolen: float


def run(name: str, particles: int, *options: str, batches: int = BATCHES, alone: bool = False) -> Run:
    """Run `tracer run` with so many particles a release and batch, on one processor alone if asked for."""
    with tempfile.TemporaryDirectory() as folder:
        output = Path(folder) / "product.nc"
        words = [sys.executable, "-m", "tracer", "run", str(ROOT / "runs" / name), "-o", str(output)]
        for setting in (f"ensemble.batches={batches}", f"ensemble.particles_per_batch={particles}"):
            words += ["--set", setting]
        stolen = stolen_seconds()
        pid = os.fork()
        if pid == 0:
            os.chdir(ROOT)
            if alone:
                os.sched_setaffinity(0, {min(os.sched_getaffinity(0))})
            silence = os.open(os.devnull, os.O_WRONLY)
            os.dup2(silence, 1)
            os.dup2(silence, 2)
            os.execv(sys.executable, [*words, *options])
        _, status, usage = os.wait4(pid, 0)
        stolen = stolen_seconds() - stolen
        if status:
            raise SystemExit(f"{' '.join(words)} ended with status {status}")
        with tracer.open_product(output) as product:
            return Run(
                product.attrs["wall_seconds"], product.attrs["kernel_seconds"], usage.ru_maxrss / 1e3, stolen
            )


def stolen_seconds() -> float:
    """Return the seconds that all processors together have lost to others so far, as the system knows of them."""
    fields = Path("/proc/stat").read_text(encoding="ascii").split("\n", 1)[0].split()
    return int(fields[STOLEN]) / os.sysconf("SC_CLK_TCK")


def releases(name: str) -> int:
    """Return the number of releases of a run file: each has as many particles."""
    return len(tracer.load_run(ROOT / "runs" / name).release)


def growth(kind: str, name: str, largest: float) -> bool:
    """Print time and memory against particles from 1e4 on; return whether they grow as they should.

    Before these stands a run of one particle a batch, which is not judged, since it touches so few cells that it costs
    less than any other; by how much a straight line through it is missed is printed.

    All on one processor: with a second one, what a batch costs to fold hides behind the tracing of the next where that
    takes longer, and short runs look too cheap.
    """
    share = BATCHES * releases(name)
    counts = [1, *(round(n / share) for n in 10.0 ** np.arange(4.0, np.log10(largest) + 0.5))]
    tries: list[list[Run]] = [[] for _ in counts]
    for number in range(TRIES):
        for count, made in zip(counts, tries, strict=True):
            if number == 0 or count < counts[-1]:
                made.append(run(name, count, "--workers", "1", alone=True))
    particles = np.array(counts) * share
    seconds = np.array([min(one.seconds for one in made) for made in tries])
    memories = np.array([max(one.memory for one in made) for made in tries])
    fixed, slope = straight_line(particles[1:], seconds[1:])
    over = seconds / (fixed + slope * particles) - 1.0
    ends = np.interp(particles, particles[[0, -1]], seconds[[0, -1]])
    over_ends = np.abs(seconds / ends - 1.0).max()
    print(f"\n{kind} ({name}), one worker, {BATCHES} batches of each of {releases(name)} releases")
    print(f"{'particles':>12s} {'seconds':>9s} {'over the line':>14s} {'memory MB':>10s}")
    for row in zip(particles, seconds, 100.0 * over, memories, strict=True):
        print("{:12,d} {:9.3f} {:+12.1f} % {:10.0f}".format(*row))
    linear, flat = np.abs(over[1:]).max(), memories[1:].max() / memories[1:].min() - 1.0
    print(
        f"{fixed:.3g} s and {slope * 1e6:.3g} microseconds a particle, by the best straight line; the one from the "
        f"first run to the last is missed by up to {100 * over_ends:.1f} %"
    )
    print(
        f"time is linear within {100 * linear:.1f} %, memory flat within {100 * flat:.1f} % (both asked: 10 %)"
    )
    return bool(linear <= MOST_DEVIATION and flat <= MOST_DEVIATION)


def straight_line(particles: NDArray[np.int64], seconds: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return constant and slope of the straight line with the least sum of squared relative deviations."""
    rows = np.column_stack([1.0 / seconds, particles / seconds])
    return np.asarray(np.linalg.lstsq(rows, np.ones(len(seconds)))[0])


def speed_up(kind: str, name: str, seconds: float, rounds: int) -> bool:
    """Print two workers over one, as threads and as processes, with batches of about `seconds` each.

    And what part of each run its kernels did not take, drawing launches, folding and waiting: it changes less than the
    speed of a machine with neighbours does.
    """
    share = BATCHES_SIDE_BY_SIDE * releases(name)
    probe = run(name, 100_000, "--workers", "1", batches=BATCHES_SIDE_BY_SIDE)
    particles = max(1, int(100_000 * seconds * share / probe.kernel))
    ways = {"1 thread": ("--workers", "1"), "2 threads": ("--workers", "2")}
    if find_spec("distributed"):
        ways |= {"1 process": ("--cluster", "local:1"), "2 processes": ("--cluster", "local:2")}
    best, beside = dict.fromkeys(ways, np.inf), dict.fromkeys(ways, np.inf)
    stolen: dict[str, list[float]] = {way: [] for way in ways}
    for _ in range(rounds):
        for way, options in ways.items():
            one = run(name, particles, *options, batches=BATCHES_SIDE_BY_SIDE)
            best[way] = min(best[way], one.seconds)
            stolen[way].append(one.stolen / one.seconds)
            beside[way] = min(beside[way], int(way[0]) * one.seconds / one.kernel - 1.0)
    print(f"\n{kind} ({name}), {share} batches of {particles} particles, about {seconds:g} s each")
    print(", ".join(f"{way}: {spent:.2f} s" for way, spent in best.items()))
    shares = ", ".join(f"{way}: {100 * share:.1f} %" for way, share in beside.items())
    print(f"wall time of all workers beyond the kernels' processor time, of the latter: {shares}")
    lost = ", ".join(f"{way}: {min(parts):.3f} to {max(parts):.3f}" for way, parts in stolen.items())
    print(f"processors that the host gave to others: {lost}")
    threads = best["1 thread"] / best["2 threads"]
    print(f"two threads over one: {threads:.3f} (asked: {LEAST_SPEED_UP})")
    fine = threads >= LEAST_SPEED_UP
    if "2 processes" in best:
        processes = best["1 process"] / best["2 processes"]
        overhead = best["2 processes"] / best["2 threads"] - 1.0
        print(f"two processes over one: {processes:.3f} (asked: {LEAST_SPEED_UP})")
        print(f"processes over threads, two of each: {100 * overhead:+.1f} % (asked: at most 5 %)")
        fine = fine and processes >= LEAST_SPEED_UP and overhead <= MOST_CLUSTER_OVERHEAD
    return fine


def main() -> int:
    """Print all; 1 where something asked for is missed."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument(
        "--particles", type=float, default=1e7, help="largest number of particles (default 1e7)"
    )
    parser.add_argument(
        "--batch-seconds", type=float, default=1.0, help="length of a batch for the speed-up (1)"
    )
    parser.add_argument(
        "--rounds", type=int, default=3, help="repeats of the speed-up; the fastest counts (3)"
    )
    parser.add_argument(
        "--kind", choices=RUN_FILES, action="append", help="only flights of this kind (default: all)"
    )
    parser.add_argument(
        "--part", choices=("growth", "speed-up"), action="append", help="only this part (default: both)"
    )
    arguments = parser.parse_args()
    kinds = {kind: RUN_FILES[kind] for kind in arguments.kind or RUN_FILES}
    parts = arguments.part or ("growth", "speed-up")
    print(
        "machine:",
        platform.processor() or platform.machine(),
        platform.platform(),
        f"{os.cpu_count()} processors",
    )
    print("load of the machine:", Path("/proc/loadavg").read_text(encoding="ascii").strip())
    fine = []
    for kind, name in kinds.items():
        if "growth" in parts:
            fine.append(growth(kind, name, arguments.particles))
        if "speed-up" in parts:
            fine.append(speed_up(kind, name, arguments.batch_seconds, arguments.rounds))
    print("\nall reached" if all(fine) else "\nsomething is missed")
    return int(not all(fine))


if __name__ == "__main__":
    sys.exit(main())
