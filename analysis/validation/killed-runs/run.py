"""Kill a run with SIGKILL at 30 random moments, go on each time, and compare the product with one made in one piece."""

import random
import shutil
import signal
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import tracer

ROOT = Path(__file__).parents[3]
KILLS = 30
SEED = 20310601
RUN = [sys.executable, "-m", "tracer", "run", str(ROOT / "runs" / "harrow-helium.toml"), "-o"]
SMALLER = ["--set", "ensemble.particles_per_batch=400", "--set", "ensemble.batches=60"]


def command(output: Path, *more: str) -> list[str]:
    """Return the run that writes `output`."""
    return [*RUN, str(output), *SMALLER, *more]


def checksum(path: Path) -> str:
    """Return the product's checksum."""
    with tracer.open_product(path) as ds:
        return str(ds.attrs["data_checksum"])


def main() -> int:
    """Print the table and the verdict; 1 where a product differs."""
    chance = random.Random(SEED)
    differing = found = 0
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        whole = folder / "whole.nc"
        begin = time.perf_counter()
        subprocess.run(command(whole), check=True, cwd=ROOT, capture_output=True)
        duration = time.perf_counter() - begin
        expected = checksum(whole)
        print(f"in one piece: {duration:.1f} s, checksum {expected[:16]}")
        for kill in range(1, KILLS + 1):
            moment = chance.uniform(0.0, duration)
            output = folder / "killed.nc"
            with subprocess.Popen(command(output), cwd=ROOT, stderr=subprocess.DEVNULL) as process:
                time.sleep(moment)
                process.send_signal(signal.SIGKILL)
            slots = len(list(folder.glob(".killed.nc.checkpoint-[ab]")))
            finished = output.exists()
            done = subprocess.run(command(output, "--resume"), cwd=ROOT, capture_output=True, text=True)
            same = done.returncode == 0 and checksum(output) == expected
            differing += not same
            found += slots > 0
            state = "had ended" if finished else f"{slots} slots"
            print(f"{kill:2d}: killed after {moment:5.2f} s, {state}: {'same' if same else 'NOT THE SAME'}")
            for path in folder.iterdir():
                if path != whole:
                    shutil.rmtree(path) if path.is_dir() else path.unlink()
    print(f"{KILLS - differing} of {KILLS} products are the same to the last bit; {found} found a checkpoint")
    return 1 if differing else 0


if __name__ == "__main__":
    sys.exit(main())
