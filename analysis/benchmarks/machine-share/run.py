"""How near the step in lanes is to the machine: its operations, their rate, and the rate of fused multiply-adds."""

import re
import subprocess
import sys
import tempfile
from pathlib import Path
from time import process_time

import numba
import numpy as np

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE.parent / "flight"))

from case import make_case  # noqa: E402

from tracer.kernels.compiling import OPTIONS  # noqa: E402
from tracer.kernels.lane_flight import launch_in_lane  # noqa: E402
from tracer.kernels.lane_step import try_steps  # noqa: E402
from tracer.kernels.lanes import LANES_SIZE, WIDTH, new_lanes  # noqa: E402
from tracer.kernels.step_control import DEFAULT_TOLERANCE  # noqa: E402

ROUNDS, CALLS = 30, 2_000

KINDS = {
    "multiply-adds": r"vfn?m(?:add|sub)\d+pd\s",
    "multiplications": r"vmulpd\s",
    "additions": r"v(?:add|sub)pd\s",
    "divisions": r"vdivpd\s",
    "roots": r"vsqrtpd\s",
}


@numba.njit(**OPTIONS, _nrt=False)
def _repeated(lanes, fresh, sky, tables, calls):
    for _ in range(calls):
        for i in range(LANES_SIZE):
            lanes[i] = fresh[i]
        try_steps(lanes, sky, tables)


def seconds_per_step(fresh: np.ndarray, sky: tuple, tables: np.ndarray) -> float:
    """Return the processor time [s] of one trial step in one lane."""
    lanes = np.empty(LANES_SIZE)
    _repeated(lanes, fresh, sky, tables, 1)
    best = np.inf
    for _ in range(ROUNDS):
        begin = process_time()
        _repeated(lanes, fresh, sky, tables, CALLS)
        best = min(best, process_time() - begin)
    return best / (CALLS * WIDTH)


def operations(*arguments: object) -> dict[str, int]:
    """Return how many operations of each kind a step takes for each lane, counted in the machine code.

    An instruction works on a group of lanes, and its loop runs over all groups once: each stands for one operation a
    lane.
    """
    compiled = numba.njit(**OPTIONS, _nrt=False)(try_steps.py_func)
    compiled(*arguments)
    text = next(iter(compiled.inspect_asm().values()))
    return {kind: len(re.findall(pattern + r".*[yz]mm", text)) for kind, pattern in KINDS.items()}


def peak() -> float:
    """Return the operations a second of fused multiply-adds, two each."""
    with tempfile.TemporaryDirectory() as folder:
        program = str(Path(folder) / "peak")
        subprocess.run(["gcc", "-O3", "-march=native", "-o", program, str(HERE / "peak.c")], check=True)
        return float(subprocess.run([program], check=True, capture_output=True, text=True).stdout)


def main() -> None:
    """Print the counts, the times and the shares."""
    case = make_case(WIDTH)
    conditions = case.work.world.light.conditions
    fresh = new_lanes()
    for lane, state in enumerate(case.states):
        launch_in_lane(fresh, lane, conditions, DEFAULT_TOLERANCE, 0.0, 1e6, tuple(map(float, state)))
    counts = operations(fresh.copy(), conditions.sky, conditions.push_tables)
    total = sum(counts.values()) + counts["multiply-adds"]
    step = seconds_per_step(fresh, conditions.sky, conditions.push_tables)
    highest = peak()
    for kind, count in counts.items():
        print(f"{kind:16s} {count:5d}")
    print(f"{'operations':16s} {total:5d} a trial step, a multiply-add counted as two")
    print(f"{1e9 * step:.1f} ns a trial step, {1e-9 * total / step:.2f} billion operations a second")
    print(
        f"{1e-9 * highest:.2f} billion a second in fused multiply-adds alone; share {total / step / highest:.2f}"
    )


if __name__ == "__main__":
    main()
