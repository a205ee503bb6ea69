"""A run of a thousand million flights: does the memory stay flat?"""

import re
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import tracer

ROOT = Path(__file__).parents[3]
RUN_FILE = ROOT / "runs" / "harrow-helium.toml"
PARTICLES = 20_000
SECONDS_BETWEEN_LOOKS = 5.0
PROBE_BATCHES = 4
MOST_GROWTH = 1.1
"""Largest over smallest memory, after the first tenth of the time."""


def resident_megabytes(pid: int) -> float:
    """Return the memory that a process holds, by the system."""
    pages = Path(f"/proc/{pid}/status").read_text(encoding="ascii")
    match = re.search(r"VmRSS:\s+(\d+) kB", pages)
    return int(match[1]) / 1e3 if match else 0.0


def run(batches: int, output: Path) -> list[float]:
    """Run that many batches and return the memory [MB] at each look."""
    sizes = [f"ensemble.batches={batches}", f"ensemble.particles_per_batch={PARTICLES}"]
    words = [sys.executable, "-m", "tracer", "run", str(RUN_FILE), "-o", str(output)]
    for size in sizes:
        words += ["--set", size]
    looks = []
    with subprocess.Popen(words, cwd=ROOT, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL) as process:
        while process.poll() is None:
            time.sleep(SECONDS_BETWEEN_LOOKS)
            try:
                looks.append(resident_megabytes(process.pid))
            except OSError:
                break
    if process.returncode:
        raise SystemExit(f"the run ended with {process.returncode}")
    return [look for look in looks if look > 0.0]


def main() -> int:
    """Run `flights` (first argument, default 1e9) and print memory by tenths of the time."""
    wanted = float(sys.argv[1]) if len(sys.argv) > 1 else 1e9
    with tempfile.TemporaryDirectory() as name:
        probe = Path(name) / "probe.nc"
        run(PROBE_BATCHES, probe)
        with tracer.open_product(probe) as ds:
            per_batch = ds.attrs["flights"] / PROBE_BATCHES
        batches = int(wanted / per_batch) + 1
        output = Path(name) / "soak.nc"
        begin = time.perf_counter()
        looks = run(batches, output)
        spent = time.perf_counter() - begin
        with tracer.open_product(output) as ds:
            flights, workers = ds.attrs["flights"], ds.attrs["workers"]
    print(f"{flights:.4g} flights in {batches} batches on {workers} workers: {spent:.0f} s")
    tenth = max(1, len(looks) // 10)
    for number in range(0, len(looks), tenth):
        part = looks[number : number + tenth]
        print(f"from {number * SECONDS_BETWEEN_LOOKS:6.0f} s: {min(part):7.1f} to {max(part):7.1f} MB")
    settled = looks[len(looks) // 10 :]
    growth = max(settled) / min(settled)
    print(f"after the first tenth: largest over smallest {growth:.3f} (asked: {MOST_GROWTH})")
    return int(growth > MOST_GROWTH)


if __name__ == "__main__":
    sys.exit(main())
