"""Progress moves while one atom makes many flights."""

from tracer.engine.batches import FIRST_SLICE_FLIGHTS, Task, make_work, trace_batch
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene

RUN = """
title = "One atom that nothing ends"
body = { name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2" }
gas = { species = "Ar" }
domain = { outer_radius = "40 radii", age_limit = "1 yr" }
surface = { temperature = { law = "uniform", value = "250 K" } }
[[release]]
name = "ground"
rate = "1e24 s-1"
speed = { law = "maxwell-flux", temperature = "surface" }
"""


def test_an_atom_under_way_counts_by_its_age():
    told: list[tuple[float, int]] = []
    work = make_work(build_scene(parse_run(RUN, "harrow.toml")), 1, 2)
    result = trace_batch(
        work, Task(0, 0), lambda atoms, flights: told.append((atoms, flights)), lambda: False
    )
    assert result.flights > 20 * FIRST_SLICE_FLIGHTS
    assert sum(flights for _, flights in told) == result.flights
    assert abs(sum(atoms for atoms, _ in told) - 2.0) < 1e-9
    assert all(atoms > 0.0 for atoms, _ in told)
    # Flights of one temperature last alike: a slice's share of the work is its share of the progress.
    first_atoms, first_flights = told[0]
    assert 0.5 < (first_atoms / 2.0) / (first_flights / result.flights) < 2.0
