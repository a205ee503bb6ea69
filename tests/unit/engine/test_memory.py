"""What a run needs is known beforehand, and what does not fit is refused before any work."""

import subprocess
import sys
import tracemalloc

import pytest

from tracer.engine.memory import available_memory, refuse_what_does_not_fit, sizes
from tracer.engine.planning import make_plan
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.engine.tracing import run
from tracer.errors import InputError

FINE = [
    "grid.altitude.cells=40",
    "grid.latitude_cells=60",
    "grid.local_time_cells=60",
    "ensemble.particles_per_batch=2",
    "ensemble.replicates=6",
]


@pytest.fixture
def plan_of(small_run_file):
    def plan(*settings: str):
        spec = load_run(small_run_file, settings)
        return make_plan(spec, build_scene(spec))

    return plan


def test_the_estimate_bounds_what_a_run_holds(small_run_file, plan_of):
    plan = plan_of(*FINE)
    spec = load_run(small_run_file, FINE)
    run(load_run(small_run_file, ["ensemble.particles_per_batch=2"]), workers=2)
    tracemalloc.start()
    try:
        run(spec, workers=2)
        _, peak = tracemalloc.get_traced_memory()
    finally:
        tracemalloc.stop()
    expected = sizes(plan, 2).memory
    # A bound that is far too wide would refuse what fits.
    assert 0.5 * expected < peak < 1.05 * expected


def test_particles_do_not_count(plan_of):
    few, many = plan_of("ensemble.particles_per_batch=2"), plan_of("ensemble.particles_per_batch=2000000")
    assert sizes(few, 2) == sizes(many, 2)


def test_a_run_that_does_not_fit_is_refused_with_both_numbers(plan_of):
    plan = plan_of(*FINE)
    needed = sizes(plan, 2).memory
    refuse_what_does_not_fit(plan, 2, needed)
    with pytest.raises(InputError) as refusal:
        refuse_what_does_not_fit(plan, 2, needed - 1)
    reason = str(refusal.value).partition("the run needs about ")[2]
    assert reason == (
        f"{needed / 1e9:.3g} GB of memory, {needed / 1e9:.3g} GB is available; "
        "ask for fewer cells, pixels, replicates or workers"
    )


def test_seventeen_terabytes_are_refused_at_once(plan_of):
    with pytest.raises(InputError, match=r"the run needs about 1\.7\d?e\+04 GB of memory"):
        refuse_what_does_not_fit(
            plan_of("grid.altitude.cells=4096", "grid.latitude_cells=4096", "grid.local_time_cells=4096"), 2
        )


def test_there_is_some_memory():
    assert 1e7 < available_memory() < 1e15


LIMITED = """
import resource
from tracer.engine.memory import available_memory
free = available_memory()
resource.setrlimit(resource.RLIMIT_AS, (2 * 10**9, 2 * 10**9))
print(available_memory() < min(free, 2 * 10**9))
"""


@pytest.mark.skipif(sys.platform != "linux", reason="only Linux says what a process holds")
def test_a_limit_of_the_process_counts():
    done = subprocess.run([sys.executable, "-c", LIMITED], capture_output=True, text=True, check=True)
    assert done.stdout == "True\n"
