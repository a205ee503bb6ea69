"""Products of moons beside their host: many flights side by side, eclipsed, hitting the host, going round it."""

import math

import numpy as np
import pytest

from tracer.engine.batches import make_work
from tracer.engine.launching import draw_launches
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene
from tracer.engine.tasks import BatchRange
from tracer.engine.tracing import run
from tracer.fate import Fate
from tracer.kernels.endings import CROSSED, LANDED, STRUCK
from tracer.kernels.integrated_flight import HAZARDS, TIME, fly, new_curve, new_flight, start_flight
from tracer.kernels.resume import ENDED, new_resume
from tracer.kernels.tracing import trace_slice
from tracer.product.merging import merged_product
from tracer.tally.buffer import tally_views

RUN = """
title = "beside the host"
body = { name = "Moon", host = { phase_angle = "0 deg" } }
sun = { true_anomaly = "60 deg" }
gas = { species = "Na" }
surface = { sticking = 1.0 }
domain = { outer_radius = "20 radii", age_limit = "1 d" }
grid = { altitude = { cells = 4, top = "8 radii" }, latitude_cells = 4, local_time_cells = 4 }
ensemble = { particles_per_batch = 100, batches = 3, replicates = 0 }
[[release]]
name = "ground"
rate = "1 s-1"
speed = { law = "maxwell-flux", temperature = "3000 K" }
"""
VENT = (
    RUN.replace('"0 deg"', '"182 deg"')
    .replace('"20 radii"', '"400 radii"')
    .replace(
        '{ law = "maxwell-flux", temperature = "3000 K" }',
        """{ law = "single", speed = "60 km/s" }
direction = "normal"
place = { law = "patch", latitude = "0 deg", local_time = 0.13, radius = "100 km" }""",
    )
)
"""Straight up from the Moon's side that faces the Earth, as wide there as three Earths."""


def test_gas_of_an_eclipsed_moon_neither_shines_nor_is_it_ionised(traced):
    near = RUN.replace('"20 radii"', '"2.2 radii"').replace('top = "8 radii"', 'top = "1 radii"')
    ds = traced(near)
    assert float(ds.emission_rate.sum()) == 0.0
    assert float(ds.ionization_rate.sum()) == 0.0
    assert float(ds.ledger.sel(fate="ionized").sum()) == 0.0
    assert float(ds.number_density.sum()) > 0.0
    # An hour's drive from the shadow's edge, at a phase of 3 deg, it does both.
    lit = traced(near.replace('"0 deg"', '"3 deg"'))
    assert float(lit.emission_rate.sum()) > 0.0
    assert float(lit.ledger.sel(fate="ionized").sum()) > 0.0


def alone(work, launches):
    """Return (ending, time, survival) of each launch, flown by itself, shape (n, 3)."""
    world, scene = work.world, work.scene
    places = world.motion.radius * launches.positions
    turned = world.surface.spin * np.column_stack([-places[:, 1], places[:, 0], np.zeros(len(places))])
    conditions, tolerance = world.light.conditions, world.light.tolerance
    flight, curve, ends = new_flight(), new_curve(), []
    for place, velocity in zip(places, launches.velocities + turned, strict=True):
        start_flight(flight, conditions, tolerance, *place, *velocity)
        ending = fly(flight, curve, conditions, tolerance, scene.age_limit)
        ends.append((ending, flight[TIME], math.exp(-flight[HAZARDS] - flight[HAZARDS + 1])))
    return np.array(ends)


@pytest.mark.parametrize(
    "text",
    [
        # Through the Earth's penumbra and umbra; past the Earth and into it.
        RUN.replace('"0 deg"', '"0.9 deg"'),
        VENT,
        VENT.replace('"60 deg"', '"60 deg", motion = "moving"'),
    ],
)
def test_flights_in_lanes_end_like_flights_alone_beside_a_host(text):
    count = 300
    scene = build_scene(parse_run(text, "host.toml"))
    work = make_work(scene, 1, count)
    launches = draw_launches(scene, scene.releases[0], count, np.random.default_rng(3), 1.0)
    buffer = np.zeros(work.layout.size)
    tally = tally_views(work.layout, buffer)
    resume, rng, budget = new_resume(len(scene.lines)), np.random.default_rng(4), 10**9
    # Nobody plays roulette, whose chances would be others alone.
    world = work.world._replace(roulette=work.world.roulette._replace(aloft=0.0))
    while resume.counters[ENDED] < count:
        trace_slice(world, launches, resume, tally, rng, budget)
    ends = alone(work, launches)
    ending, kept = ends[:, 0], ends[:, 2]
    # Far flights are exact to 1e-6 of their distance, and the light's edges amplify that; nothing may end otherwise.
    assert tally.ledger[Fate.CAPTURED] == pytest.approx(kept[ending == LANDED].sum(), rel=1e-4)
    assert tally.ledger[Fate.ESCAPED] == pytest.approx(kept[ending == CROSSED].sum(), rel=1e-4)
    assert tally.ledger[Fate.OTHER_LOSS] == pytest.approx(tally.struck[0], abs=1e-7)
    assert tally.struck[0] == pytest.approx(kept[ending == STRUCK].sum(), rel=1e-4)
    assert tally.ledger[Fate.UNRESOLVED] == 0.0
    assert tally.ledger.sum() == pytest.approx(count, rel=1e-12)
    if "0.9 deg" in text:
        # Partly in the dark: what is ionised in as long a time in full light is more.
        station = scene.sun.station
        bright = scene.sun.photo.ionizing * (1.495978707e11 / station.distance) ** 2
        assert 0.0 < tally.ledger[Fate.IONIZED] < 0.8 * count * np.mean(1.0 - np.exp(-bright * ends[:, 1]))
    else:
        assert np.sum(ending == STRUCK) >= 3


def test_what_hits_the_host_has_its_own_line_and_the_budget_closes(traced):
    ds = traced(VENT)
    assert float(ds.host_impact_rate.sum()) > 0.0
    assert float(ds.host_impact_rate_standard_error.sum()) > 0.0
    assert ds.host_impact_rate.attrs["units"] == "s-1"
    np.testing.assert_allclose(ds.host_impact_rate, ds.ledger.sel(fate="other_loss"), rtol=1e-6)
    assert float(ds.ledger.sum() - ds.roulette_balance.sum()) == pytest.approx(1.0, rel=1e-9)
    # Aimed at by nothing: at a phase of 90 deg the Earth stands elsewhere.
    past = traced(VENT.replace('"182 deg"', '"90 deg"'))
    assert float(past.host_impact_rate.sum()) == 0.0
    assert ds.attrs["host"] == "Earth"
    assert ds.attrs["phase_angle"] == 182.0
    assert ds.attrs["frame_rate"] == pytest.approx(2.0 * math.pi / (27.32166 * 86400.0))


def test_a_body_without_a_host_has_no_line_for_it(small_light_product):
    assert "host_impact_rate" not in small_light_product
    assert "host" not in small_light_product.attrs


def test_a_moving_moon_is_one_that_stands_while_its_phase_hardly_changes(traced):
    """Flights of an hour, in which the phase changes by half a degree, far from the shadow: both frames agree."""
    text = RUN.replace('"0 deg"', '"100 deg"').replace('"1 d"', '"1 h"')
    still = traced(
        text.replace("particles_per_batch = 100, batches = 3", "particles_per_batch = 300, batches = 10")
    )
    moving = traced(
        text.replace(
            "particles_per_batch = 100, batches = 3", "particles_per_batch = 100, batches = 10"
        ).replace('"60 deg"', '"60 deg", motion = "moving"')
    )
    assert moving.attrs["motion"] == "moving"
    # A degree of phase of the Moon takes two hours: the limit of age is less.
    assert moving.attrs["event_window"] == pytest.approx(3600.0)
    for name, atoms in (("number_density", "cell_volume"), ("emission_rate", "cell_volume")):
        sums = [float((ds[name] * ds[atoms]).sum()) for ds in (still, moving)]
        assert sums[1] == pytest.approx(sums[0], rel=0.1)
    np.testing.assert_allclose(moving.ledger.sum(), 1.0, rtol=1e-9)
    for fate in ("captured", "age_limit"):
        one, other = (ds.ledger.sel(fate=fate).item() for ds in (still, moving))
        error = math.hypot(*(ds.ledger_standard_error.sel(fate=fate).item() for ds in (still, moving)))
        assert abs(one - other) < 4.0 * error + 1e-3


@pytest.mark.parametrize("motion", ["stationary", "moving"])
def test_products_beside_a_host_are_the_same_for_any_workers_and_merge(motion):
    text = VENT.replace('"60 deg"', f'"60 deg", motion = "{motion}"')
    spec = parse_run(text, "host.toml", ["ensemble.batches=4"])
    one, two = run(spec, workers=1), run(spec, workers=2)
    assert one.attrs["data_checksum"] == two.attrs["data_checksum"]
    parts = [run(spec, workers=1, batches=BatchRange(*ends)) for ends in ((0, 1), (1, 4))]
    merged = merged_product([(f"part {i}", part) for i, part in enumerate(parts)])
    np.testing.assert_allclose(merged.host_impact_rate, one.host_impact_rate, rtol=1e-12)
    np.testing.assert_allclose(merged.attrs["host_position"], one.attrs["host_position"])
