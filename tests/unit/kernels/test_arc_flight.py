"""Closed hops are the arcs that universal functions give, and leave their whole duration in the cells."""

import numpy as np
import pytest

from tracer.engine.batches import make_work
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.kernels.arc import landing, make_arc, state_at
from tracer.kernels.arc_flight import LEAST_BINDING, arc_end, arc_state, closed_hop, hop_end, launch_arc
from tracer.kernels.endings import LANDED
from tracer.kernels.launches import Launches
from tracer.kernels.resume import new_resume
from tracer.kernels.tracing import trace_slice
from tracer.kernels.world import Motion
from tracer.tally.buffer import tally_views

GM, RADIUS = 22031.868e9, 2439.4e3
ESCAPE = np.sqrt(2.0 * GM / RADIUS)


def motion(frame_rate: float = 0.0, age_limit: float = 1e9) -> Motion:
    return Motion(GM, RADIUS, 40.0 * RADIUS, frame_rate, age_limit, 0.0)


def launches(count: int, seed: int) -> np.ndarray:
    """Return states (n, 6) on the ground, upwards in any direction, from slow to just below escape."""
    rng = np.random.default_rng(seed)
    up = rng.normal(size=(count, 3))
    up /= np.linalg.norm(up, axis=1)[:, None]
    way = rng.normal(size=(count, 3))
    way /= np.linalg.norm(way, axis=1)[:, None]
    way *= np.copysign(1.0, (way * up).sum(axis=1))[:, None]
    return np.hstack([RADIUS * up, ESCAPE * rng.uniform(0.02, 0.985, count)[:, None] * way])


@pytest.mark.parametrize("frame_rate", [0.0, 1e-5])
def test_closed_hops_land_where_universal_functions_say(frame_rate):
    world_motion = motion(frame_rate)
    hops = 0
    for state in launches(500, 3):
        arc = launch_arc(world_motion, *state)
        ending, s = arc_end(world_motion, arc, 1e9)
        closed, hop = closed_hop(arc, world_motion.outer_radius, 1e9)
        assert closed == (ending == LANDED)
        if closed:
            hops += 1
            expected, found = (
                np.array(arc_state(world_motion, arc, s)),
                np.array(hop_end(world_motion, arc, hop)),
            )
            scale = np.array([expected[0], *[RADIUS] * 3, *[ESCAPE] * 3])
            # Rounding grows with the apex, 33 radii at the most here.
            np.testing.assert_allclose(found / scale, expected / scale, rtol=0.0, atol=1e-12)
    assert hops > 400


def test_landing_of_a_closed_hop_is_on_the_ground_to_rounding():
    for state in launches(200, 4):
        arc = launch_arc(motion(), *state)
        closed, hop = closed_hop(arc, 40.0 * RADIUS, 1e9)
        if closed:
            assert np.linalg.norm(hop_end(motion(), arc, hop)[1:4]) == pytest.approx(RADIUS, rel=1e-12)


def test_what_is_no_well_bound_hop_is_left_to_universal_functions():
    up = (RADIUS, 0.0, 0.0)
    barely = ESCAPE * np.sqrt(1.0 - 0.4 * LEAST_BINDING)
    for speed in (barely, 1.01 * ESCAPE, 0.0):
        assert not closed_hop(make_arc(GM, *up, speed, 0.0, 0.0), 1e6 * RADIUS, 1e9)[0]
    arc = make_arc(GM, *up, 1000.0, 0.0, 0.0)
    closed, hop = closed_hop(arc, 40.0 * RADIUS, 1e9)
    assert closed
    assert hop[0] == pytest.approx(state_at(arc, landing(arc))[0], rel=1e-13)
    # Too late to land, or too high to come back.
    assert not closed_hop(arc, 40.0 * RADIUS, 0.99 * hop[0])[0]
    assert not closed_hop(arc, 1.01 * RADIUS, 1e9)[0]


@pytest.mark.parametrize("share", [0.1, 0.5, 0.9, 0.98])
def test_samples_of_a_hop_hold_its_duration(small_run_file, share):
    changes = ["surface.sticking=1.0", "grid.altitude.top=19 radii"]
    work = make_work(build_scene(load_run(small_run_file, changes))._replace(losses=()), 1, 1)
    radius, gm = work.world.motion.radius, work.world.motion.gm
    speed = share * np.sqrt(2.0 * gm / radius) * np.sqrt(0.9)
    count = 400
    launch = Launches(
        np.tile([0.6, 0.0, 0.8], (count, 1)),
        np.tile([0.8 * speed, 0.0, 0.6 * speed], (count, 1)),
        np.ones(count),
    )
    tally = tally_views(work.layout, np.zeros(work.layout.size))
    trace_slice(work.world, launch, new_resume(0), tally, np.random.default_rng(1), count)
    # Samples in even steps from a random start: their sum scatters little, and its mean is the duration.
    assert tally.content.sum() == pytest.approx(tally.life[0], rel=2e-3)
