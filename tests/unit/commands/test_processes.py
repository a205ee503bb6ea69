"""The command line as processes: start-up, Ctrl-C, two runs at once."""

import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest

LONG_RUN = """
title = "Long"
body = { name = "Ball", radius = "1000 km", gm = "3000 km3 s-2" }
gas = { species = "He" }
surface = { temperature = { law = "uniform", value = "100 K" } }
domain = { outer_radius = "20 radii", age_limit = "1000 yr" }
grid = { altitude = { cells = 5 }, latitude_cells = 4, local_time_cells = 6 }
ensemble = { particles_per_batch = 1000, batches = 4 }
[[release]]
name = "vent"
rate = "1e20 s-1"
speed = { law = "maxwell-flux", temperature = "surface" }
"""


@contextmanager
def started(command: list[str], folder: Path) -> Iterator[subprocess.Popen[str]]:
    """Yield a running process, and see to it that it does not outlive the test.

    Ctrl-C reaches it even where the tests themselves run in the background of a shell, which has it ignored.
    """
    before = signal.signal(signal.SIGINT, signal.default_int_handler)
    try:
        process = subprocess.Popen(command, cwd=folder, stderr=subprocess.PIPE, text=True)
    finally:
        signal.signal(signal.SIGINT, before)
    with process:
        try:
            yield process
        finally:
            process.kill()


def test_help_loads_no_heavy_library():
    code = (
        "import sys\n"
        "from tracer.__main__ import main\n"
        "try:\n    main(['--help'])\nexcept SystemExit:\n    pass\n"
        "print([name for name in ('numpy', 'numba', 'xarray', 'astropy', 'matplotlib') if name in sys.modules])"
    )
    shown = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout
    assert shown.splitlines()[-1] == "[]"


def test_import_of_the_package_is_light():
    code = (
        "import sys, tracer\nprint([n for n in ('numpy', 'numba', 'xarray', 'pydantic') if n in sys.modules])"
    )
    shown = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout
    assert shown == "[]\n"


@pytest.mark.skipif(os.name == "nt", reason="signals to processes are POSIX")
def test_ctrl_c_ends_a_run_within_a_second_and_leaves_no_file(tmp_path):
    Path(tmp_path, "long.toml").write_text(LONG_RUN, encoding="utf-8")
    command = [sys.executable, "-m", "tracer", "run", "long.toml", "--workers", "2"]
    with started(command, tmp_path) as process:
        # The first line says that compiling is over and tracing has begun.
        assert "tracing" in process.stderr.readline()
        process.send_signal(signal.SIGINT)
        begin = time.monotonic()
        errors = process.stderr.read()
        process.wait(timeout=60)
    # One second is promised on an idle machine, and the tests share theirs; a batch would take minutes.
    assert time.monotonic() - begin < 8.0
    assert process.returncode == 3
    assert "interrupted" in errors
    assert [path.name for path in tmp_path.iterdir()] == ["long.toml"]


def test_second_run_for_the_same_output_is_refused_at_once(tmp_path):
    Path(tmp_path, "long.toml").write_text(LONG_RUN, encoding="utf-8")
    command = [sys.executable, "-m", "tracer", "run", "long.toml"]
    with started(command, tmp_path) as first:
        assert "tracing" in first.stderr.readline()
        second = subprocess.run(command, cwd=tmp_path, capture_output=True, text=True, timeout=60)
    assert second.returncode == 2
    assert "is being made by another run" in second.stderr
