"""Seconds to `tracer --help`, and to the first batch with an empty and with a filled cache of kernels."""

import os
import subprocess
import sys
import tempfile
import time
from pathlib import Path

RUN_FILES = ("mercury-sodium.toml", "harrow-helium.toml")
ROOT = Path(__file__).parents[3]
"""This checkout: it is what Python imports there, whatever else is installed."""

FIRST_BATCH = """
import sys
from pathlib import Path
import tracer
from tracer.engine.batches import Task, make_work, trace_batch
from tracer.engine.scene import build_scene

work = make_work(build_scene(tracer.load_run(Path(sys.argv[1]))), 1, 100)
trace_batch(work, Task(0, 0), lambda atoms, flights: None, lambda: False)
"""
REPEATS = 3


def timed(command: list[str], cache: str) -> tuple[float, float]:
    """Return (seconds by the clock, processor seconds) of `command` with kernels kept in `cache`."""
    before, clock = os.times(), time.perf_counter()
    environment = {**os.environ, "XDG_CACHE_HOME": cache}
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL, env=environment, cwd=ROOT)
    after = os.times()
    spent = after.children_user + after.children_system - before.children_user - before.children_system
    return time.perf_counter() - clock, spent


def main() -> int:
    """Print the table."""
    rows = []
    with tempfile.TemporaryDirectory() as cache:
        helped = [sys.executable, "-m", "tracer", "--help"]
        rows.append(("tracer --help", min(timed(helped, cache) for _ in range(REPEATS))))
    for name in RUN_FILES:
        command = [sys.executable, "-c", FIRST_BATCH, str(ROOT / "runs" / name)]
        with tempfile.TemporaryDirectory() as cache:
            rows.append((f"{name}: first batch, first start", timed(command, cache)))
            second = min(timed(command, cache) for _ in range(REPEATS))
            rows.append((f"{name}: first batch, second start", second))
    print(f"{'':50s} {'seconds':>8s} {'processor':>10s}")
    for what, (clock, spent) in rows:
        print(f"{what:50s} {clock:8.2f} {spent:10.2f}")
    return 0


if __name__ == "__main__":
    sys.exit(main())
