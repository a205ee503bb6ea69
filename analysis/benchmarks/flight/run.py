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
    heyoka_ends = None

COMPILER = "gcc -O3 -march=native -ffast-math"
REFERENCE_TOLERANCE = 1e-12
TALLIES = ("nothing", "density", "all")


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
    field["integrated kernel, counting nothing"] = lambda: min(kernel(), kernel(), key=lambda r: r.seconds)
    field["integrated kernel, counting all"] = integrated
    field["arcs, gravity alone, counting all"] = lambda: Result(traced(case.gravity, case.launches)[0], count)
    field[f"SciPy RK45, rtol {RELATIVE_TOLERANCE:.0e}"] = lambda: Result(
        *_part(scipy_ends(case, few // 10), few // 10)
    )
    if heyoka_ends is not None:
        field[f"heyoka, tolerance {TOLERANCE:.0e}, no shadow"] = lambda: Result(
            *_part(heyoka_ends(case, few), few)
        )
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


def landing_errors(ends: Floats, reference: Floats, radius: float) -> str:
    """Return median, 99 % and 99.9 % of the distances between landing places [radii], and endings that differ."""
    true = reference[: len(ends)]
    both = (ends[:, 0] == LANDED) & (true[:, 0] == LANDED)
    miss = np.linalg.norm(ends[both, 2:5] - true[both, 2:5], axis=1) / radius
    differ = int(np.sum(ends[:, 0] != true[:, 0]))
    return " ".join(f"{q:8.1e}" for q in np.quantile(miss, [0.5, 0.99, 0.999])) + f" {differ:6d}"


def report(case: Case, best: dict[str, Result], reference: Floats, own: Floats | None) -> bool:
    """Print the table and return whether the integrated kernel is at least level with C."""
    rates = {name: result.flights / result.seconds for name, result in best.items()}
    likes = {"nothing": rates["C, counting nothing"], "all": rates["C, counting all"]}
    print(
        f"{'':40s} {'flights/s':>10s} {'C, nothing':>10s} {'C, density':>10s} {'C, all':>8s} {'steps':>6s}"
        f" {'trials':>6s} landing error [radii]: median, 99 %, 99.9 %; other ending"
    )
    for name, result in best.items():
        ratios = [rates[name] / rates[f"C, counting {word}"] for word in TALLIES]
        truth = own if name.startswith("heyoka") else reference
        errors = (
            "" if result.ends is None else landing_errors(result.ends, truth, case.work.scene.body.radius)
        )
        print(
            f"{name:40s} {rates[name]:10.0f} {ratios[0]:10.3f} {ratios[1]:10.3f} {ratios[2]:8.3f}"
            f" {result.steps / result.flights:6.2f} {result.trials / result.flights:6.2f} {errors}"
        )
    quotients = {word: rates[f"integrated kernel, counting {word}"] / rate for word, rate in likes.items()}
    steps = best["integrated kernel, counting nothing"].steps / best["C, counting nothing"].steps
    print(f"steps of the kernel / steps of C: {steps:.4f}")
    for word, quotient in quotients.items():
        print(f"integrated kernel / C, both counting {word}: {quotient:.3f}")
    return min(quotients.values()) >= 1.0 and abs(steps - 1.0) < 0.1


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
    """Race, report and return 0 where the integrated kernel is at least level with C."""
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
    level = report(case, best, reference, own)
    if heyoka_ends is None:
        print("heyoka is not installed: pip install 'exosphere-tracer[bench]'")
    print("holds" if level else "FAILS")
    return 0 if level else 1


if __name__ == "__main__":
    sys.exit(main())
