"""Flights per second and landing errors: C, the package's kernels, SciPy, heyoka, on the same launches in one run."""

import argparse
import platform
import shlex
import subprocess
import sys
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import NamedTuple

import numpy as np
from case import HERE, Case, Floats, make_case, write_case
from package_flights import kernel_ends, traced
from scipy_flights import RELATIVE_TOLERANCE, scipy_ends

from tracer.kernels.endings import LANDED
from tracer.kernels.step_control import DEFAULT_TOLERANCE

try:
    from heyoka_flights import TOLERANCE, heyoka_ends
except ImportError:
    heyoka_ends, TOLERANCE = None, np.nan

COMPILER = "gcc -O3 -march=native -ffast-math"
REFERENCE_TOLERANCE = 1e-12
TALLIES = ("nothing", "density", "all")

KERNEL_ALONE, KERNEL = "integrated kernel, counting nothing", "integrated kernel, counting all"
ARCS = "arcs, gravity alone, counting all"
SCIPY, HEYOKA = f"SciPy RK45, rtol {RELATIVE_TOLERANCE:.0e}", f"heyoka, tolerance {TOLERANCE:.0e}, no shadow"
GOALS = (
    (KERNEL, "C, counting density", 2.5),
    (KERNEL, "C, counting all", 2.5),
    (KERNEL, HEYOKA, 10.0),
    (KERNEL, SCIPY, 800.0),
    (ARCS, KERNEL, 5.0),
)
"""Whose flights per second over whose, and how many times as many are asked for."""

MOST_ERROR = 1.1
"""How much larger than those of C the kernel's landing errors may be, in median, 99 and 99.9 %."""


class Result(NamedTuple):
    """Processor `seconds` of `flights`; accepted `steps` and `trials` in all, `ends` (n, 6) where they are kept."""

    seconds: float
    flights: int
    steps: float = np.nan
    trials: float = np.nan
    ends: Floats | None = None


def compile_c(folder: Path) -> Path:
    """Return the program made of flight.c."""
    program = folder / "flight"
    source = str(HERE / "flight.c")
    subprocess.run([*shlex.split(COMPILER), "-o", str(program), source, "-lm"], check=True)
    return program


def fly_c(program: Path, file: Path, tally: int, count: int) -> Result:
    """Return the better of two rounds of the C program."""
    ends = file.with_suffix(".ends")
    command = [str(program), str(file), str(tally), "2", str(ends)]
    lines = subprocess.run(command, check=True, capture_output=True, text=True).stdout.splitlines()
    seconds, steps, trials = min(tuple(map(float, line.split())) for line in lines)
    return Result(seconds, count, steps, trials, np.fromfile(ends).reshape(-1, 6))


def contestants(case: Case, program: Path, file: Path, few: int) -> dict[str, Callable[[], Result]]:
    """Return each contestant's name and how to let it fly once."""
    count = len(case.states)

    def kernel() -> Result:
        seconds, steps, trials, ends = kernel_ends(case, DEFAULT_TOLERANCE, count)
        return Result(seconds, count, steps, trials, ends)

    # The better of two, as of the C program.
    def integrated() -> Result:
        seconds, steps = min(traced(case.work, case.launches) for _ in range(2))
        return Result(seconds, count, steps)

    field: dict[str, Callable[[], Result]] = {
        f"C, counting {word}": lambda tally=tally: fly_c(program, file, tally, count)  # type: ignore[misc]
        for tally, word in enumerate(TALLIES)
    }
    field[KERNEL_ALONE] = lambda: min(kernel(), kernel(), key=lambda r: r.seconds)
    field[KERNEL] = integrated
    field[ARCS] = lambda: Result(traced(case.gravity, case.launches)[0], count)
    field[SCIPY] = lambda: Result(*_part(scipy_ends(case, few // 10), few // 10))
    if heyoka_ends is not None:
        field[HEYOKA] = lambda: Result(*_part(heyoka_ends(case, few), few))
    return field


def _part(timed: tuple[float, Floats], count: int) -> tuple[float, int, float, float, Floats]:
    return timed[0], count, np.nan, np.nan, timed[1]


def race(field: dict[str, Callable[[], Result]], rounds: int) -> dict[str, Result]:
    """Let all fly in turn, `rounds` times, and return each one's fastest round."""
    best: dict[str, Result] = {}
    for _ in range(rounds):
        for name, fly in field.items():
            result = fly()
            if name not in best or result.seconds < best[name].seconds:
                best[name] = result
    return best


def landing_errors(result: Result, reference: Floats, radius: float) -> tuple[Floats, int]:
    """Return median, 99 % and 99.9 % of the distances between landing places [radii], and how many ends differ."""
    true = reference[: len(result.ends)]
    both = (result.ends[:, 0] == LANDED) & (true[:, 0] == LANDED)
    miss = np.linalg.norm(result.ends[both, 2:5] - true[both, 2:5], axis=1) / radius
    return np.quantile(miss, [0.5, 0.99, 0.999]), int(np.sum(result.ends[:, 0] != true[:, 0]))


def report(case: Case, best: dict[str, Result], reference: Floats, own: Floats | None) -> bool:
    """Print the table and what is asked for, and return whether all of that is reached."""
    rates = {name: result.flights / result.seconds for name, result in best.items()}
    print(
        f"{'':40s} {'flights/s':>10s} {'C, nothing':>10s} {'C, density':>10s} {'C, all':>8s} {'steps':>6s}"
        f" {'trials':>6s} landing error [radii]: median, 99 %, 99.9 %; other ending"
    )
    misses = {}
    for name, result in best.items():
        ratios = [rates[name] / rates[f"C, counting {word}"] for word in TALLIES]
        errors = ""
        if result.ends is not None:
            truth = own if name.startswith("heyoka") else reference
            misses[name], differ = landing_errors(result, truth, case.work.scene.body.radius)
            errors = " ".join(f"{miss:8.1e}" for miss in misses[name]) + f" {differ:6d}"
        print(
            f"{name:40s} {rates[name]:10.0f} {ratios[0]:10.3f} {ratios[1]:10.3f} {ratios[2]:8.3f}"
            f" {result.steps / result.flights:6.2f} {result.trials / result.flights:6.2f} {errors}"
        )
    reached = []
    for name, other, asked in GOALS:
        if other in rates:
            ratio = rates[name] / rates[other]
            print(f"{name} / {other}: {ratio:.2f} (asked: {asked:g})")
            reached.append(ratio >= asked)
    worse = np.max(misses[KERNEL_ALONE] / misses["C, counting nothing"])
    print(f"landing errors of the kernel / those of C: at most {worse:.2f} (asked: {MOST_ERROR})")
    return all(reached) and worse <= MOST_ERROR


def describe() -> None:
    """Print machine, compiler and commit."""
    model = [line for line in _output("lscpu").splitlines() if line.startswith("Model name")]
    print("machine:", *(line.split(":")[1].strip() for line in model), platform.platform())
    print("compiler:", _output("gcc --version").splitlines()[0], "|", COMPILER)
    print("commit:", _output(f"git -C {HERE} describe --always --dirty").strip())
    print("load of the machine:", Path("/proc/loadavg").read_text(encoding="ascii").strip())


def _output(command: str) -> str:
    return subprocess.run(shlex.split(command), capture_output=True, text=True, check=True).stdout


def main() -> int:
    """Race, report and return 0 where all that is asked for is reached."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--launches", type=int, default=20_000)
    parser.add_argument("--rounds", type=int, default=10)
    parser.add_argument("--few", type=int, default=4_000, help="launches of heyoka; SciPy flies a tenth")
    options = parser.parse_args()
    describe()
    case = make_case(options.launches)
    few = min(options.few, options.launches)
    _, _, _, reference = kernel_ends(case, REFERENCE_TOLERANCE, options.launches)
    own = None if heyoka_ends is None else heyoka_ends(case, few, np.finfo(float).eps)[1]
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "case"
        write_case(file, case)
        field = contestants(case, compile_c(Path(folder)), file, few)
        race(field, 1)
        best = race(field, options.rounds)
    fine = report(case, best, reference, own)
    if heyoka_ends is None:
        print("heyoka is not installed: pip install 'exosphere-tracer[bench]'")
    print("holds" if fine else "FAILS")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
