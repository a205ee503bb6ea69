"""Compile the kernels that the tests share into the user's cache: `python tests/warm_kernels.py`.

In two processes, each with about half of the work: `KINDS` says which. A name of it as argument has only that one done.
"""

import subprocess
import sys

import numpy as np
from small_runs import HOST_RUN, MOVING_HOST_RUN, MOVING_RUN, SMALL_LIGHT_RUN, SMALL_RUN

from tracer.engine.batches import Work, compile_kernels, make_work
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene
from tracer.engine.tracing import run
from tracer.kernels.integrated_flight import fly, new_curve, new_flight, start_flight
from tracer.kernels.surface_map import SurfaceMap
from tracer.observe.gas import gas_of
from tracer.observe.integration import integrals_along
from tracer.observe.sights import Sights
from tracer.physics.release.even_numbers import PLACE, SPEED, TURN, EvenNumbers
from tracer.physics.release.place.flux_map import flux_map
from tracer.physics.release.speed.table import Table


def compiled(text: str) -> Work:
    """Compile what traces a run file's text."""
    work = make_work(build_scene(parse_run(text, "run file")), 1, 1)
    compile_kernels(work)
    return work


def warm_still() -> None:
    """Compile flights about bodies that stand still, side by side and alone, and sums along lines of sight."""
    compiled(HOST_RUN)
    work = compiled(SMALL_LIGHT_RUN)
    flight, curve = new_flight(), new_curve()
    conditions = work.world.light.conditions
    start_flight(flight, conditions, 1e-6, work.scene.body.radius, 0.0, 0.0, 1000.0, 0.0, 0.0)
    fly(flight, curve, conditions, 1e-6, 1.0)
    # Flights on arcs are here by now, from the other process.
    looks = Sights(np.array([[5.0, 0.0, 0.0]]), np.array([[-1.0, 0.0, 0.0]]))
    integrals_along(gas_of(run(parse_run(SMALL_RUN, "run file"), workers=1)), looks)


def warm_laws() -> None:
    """Compile what launches of the small runs don't call: tables, maps, points of any number."""
    u = EvenNumbers(np.random.default_rng(1)).points(np.arange(2))
    Table(np.array([0.0, 1.0]), np.ones(2)).speeds(u[:, SPEED], np.full(2, np.nan), 1.0)
    everywhere = SurfaceMap(np.array([-45.0, 45.0]), np.array([6.0, 18.0]), np.ones((2, 2)))
    flux_map(everywhere).places(u[:, PLACE : TURN + 1])


def warm_arcs_and_moving() -> None:
    """Compile further laws, flights on arcs and about bodies that move, alone and beside a host."""
    warm_laws()
    for text in (SMALL_RUN, MOVING_RUN, MOVING_HOST_RUN):
        compiled(text)


KINDS = {"still": warm_still, "moving": warm_arcs_and_moving}

if __name__ == "__main__":
    if len(sys.argv) > 1:
        KINDS[sys.argv[1]]()
    else:
        processes = [subprocess.Popen([sys.executable, __file__, kind]) for kind in KINDS]
        ends = [process.wait() for process in processes]
        sys.exit(any(ends))
