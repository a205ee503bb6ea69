"""Closed hops are the arcs that universal functions give, and leave their whole duration in the cells."""

import math
import re

import llvmlite.binding as llvm
import numba
import numpy as np
import pytest

from tracer.engine.batches import make_work
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.kernels import hop_lanes
from tracer.kernels import lanes as row
from tracer.kernels.arc import landing, make_arc, state_at
from tracer.kernels.arc_flight import LEAST_BINDING, arc_end, arc_state, closed_hop, launch_arc
from tracer.kernels.arc_lanes import cell_of_sample
from tracer.kernels.cells import altitude_cell, latitude_cell, local_time_cell, make_cells
from tracer.kernels.compiling import OPTIONS
from tracer.kernels.endings import FLYING, LANDED
from tracer.kernels.hop_lanes import LEAST_SAMPLES, SAMPLES_PER_ANGLE, fly_hops, launch_on_arc, sample_hops
from tracer.kernels.lanes import WIDTH, new_lanes
from tracer.kernels.launches import Launches
from tracer.kernels.resume import new_resume
from tracer.kernels.tracing import trace_slice
from tracer.kernels.world import Motion
from tracer.tally.buffer import tally_views

GM, RADIUS = 22031.868e9, 2439.4e3
ESCAPE = np.sqrt(2.0 * GM / RADIUS)
FEATURES = llvm.get_host_cpu_features()


def motion(frame_rate: float = 0.0, age_limit: float = 1e9, hazard: float = 0.0) -> Motion:
    return Motion(GM, RADIUS, 40.0 * RADIUS, frame_rate, age_limit, hazard)


def grid():
    altitudes = np.concatenate(([0.0], np.geomspace(1e4, 40.0 * RADIUS, 49)))
    per_log = 48.0 / math.log(altitudes[-1] / altitudes[1])
    return make_cells(RADIUS, RADIUS + altitudes, 1e4, per_log, 36, 48)


def flown(world_motion: Motion, states: np.ndarray, drawn: float = 0.5) -> np.ndarray:
    """Return lanes whose atoms, launched in `states` (n, 6), have flown their closed hops; n is up to `WIDTH`."""
    lanes = new_lanes()
    lanes[row.DRAWN : row.DRAWN + WIDTH] = drawn
    for lane, state in enumerate(states):
        lanes[row.ALIVE + lane] = 1.0 + lane
        launch_on_arc(lanes, lane, world_motion.frame_rate, world_motion.age_limit, state)
    fly_hops(lanes, world_motion)
    return lanes


def end_of(lanes: np.ndarray, lane: int) -> np.ndarray:
    """Return the time, place and velocity at a lane's landing."""
    return np.array(
        [lanes[row.TIME + lane], *lanes[row.END + lane : row.END + 6 * WIDTH : WIDTH]],
    )


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
    states = launches(16 * WIDTH, 3)
    for block in states.reshape(-1, WIDTH, 6):
        lanes = flown(world_motion, block)
        for lane, state in enumerate(block):
            arc = launch_arc(world_motion, *state)
            ending, s = arc_end(world_motion, arc, 1e9)
            standing = lanes[row.STANDING + lane]
            assert standing == (LANDED if ending == LANDED else FLYING)
            if standing == LANDED:
                hops += 1
                expected = np.array(arc_state(world_motion, arc, s))
                scale = np.array([expected[0], *[RADIUS] * 3, *[ESCAPE] * 3])
                # Rounding grows with the apex, 33 radii at the most here.
                np.testing.assert_allclose(
                    end_of(lanes, lane) / scale, expected / scale, rtol=0.0, atol=1e-12
                )
    assert hops > 400


def test_landing_of_a_closed_hop_is_on_the_ground_to_rounding():
    for block in launches(6 * WIDTH, 4).reshape(-1, WIDTH, 6):
        lanes = flown(motion(), block)
        for lane in np.flatnonzero(lanes[row.STANDING : row.STANDING + WIDTH] == LANDED):
            assert np.linalg.norm(end_of(lanes, lane)[1:4]) == pytest.approx(RADIUS, rel=1e-12)


def test_a_vertical_hop_takes_the_time_of_free_fall():
    """Up to h and back: t = 2 sqrt(a^3/GM) (pi - (E - sin E)), a = (R + h)/2, cos E = 1 - R/a: Kepler's equation."""
    for height in (0.001, 0.1, 1.0, 8.0):
        speed = math.sqrt(2.0 * GM * (1.0 / RADIUS - 1.0 / (RADIUS * (1.0 + height))))
        lanes = flown(motion(), np.array([[0.0, 0.0, RADIUS, 0.0, 0.0, speed]]))
        a = 0.5 * RADIUS * (1.0 + height)
        anomaly = math.acos(1.0 - RADIUS / a)
        expected = 2.0 * math.sqrt(a**3 / GM) * (math.pi - (anomaly - math.sin(anomaly)))
        assert end_of(lanes, 0)[0] == pytest.approx(expected, rel=1e-11)


@pytest.mark.parametrize("frame_rate", [0.0, 1e-4])
def test_samples_of_a_hop_lie_on_its_arc(frame_rate):
    """Place, velocity, time and content of every sample are those of universal functions; cells those of its place."""
    hazard, cells = 2e-4, grid()
    world_motion = motion(frame_rate, hazard=hazard)
    states = launches(WIDTH, 7)
    lanes = flown(world_motion, states, 0.3)
    samples = lanes[row.SAMPLES : row.SAMPLES + WIDTH].astype(int)
    assert samples.min() < 8 < samples.max()
    for number in range(samples.max()):
        sample_hops(lanes, world_motion, cells, True)
        for lane in np.flatnonzero(samples > number):
            arc = launch_arc(world_motion, *states[lane])
            angle = landing(arc) * math.sqrt(arc.beta)
            assert samples[lane] == LEAST_SAMPLES + math.floor(SAMPLES_PER_ANGLE * angle)
            width = landing(arc) / samples[lane]
            t, *expected = arc_state(world_motion, arc, (number + 0.3) * width)
            place = lanes[row.SAMPLE + lane : row.SAMPLE + 3 * WIDTH : WIDTH]
            velocity = lanes[row.SAMPLE_VELOCITY + lane : row.SAMPLE_VELOCITY + 3 * WIDTH : WIDTH]
            r = np.linalg.norm(place)
            np.testing.assert_allclose(place, expected[:3], rtol=0.0, atol=1e-11 * r)
            np.testing.assert_allclose(velocity, expected[3:], rtol=0.0, atol=1e-11 * ESCAPE)
            assert lanes[row.SAMPLE_R + lane] == pytest.approx(r, rel=1e-11)
            content = (1.0 + lane) * math.exp(-hazard * t) * r * width
            assert lanes[row.CONTENT + lane] == pytest.approx(content, rel=1e-11)
            assert cell_of_sample(cells, lanes, lane) == (
                altitude_cell(cells, r),
                latitude_cell(cells, place[2] / r),
                local_time_cell(cells, place[0], place[1]),
            )


def test_what_hops_take_from_the_budget():
    hazard = 3e-4
    states = launches(WIDTH, 9)
    lanes = flown(motion(hazard=hazard), states)
    hops = lanes[row.STANDING : row.STANDING + WIDTH] == LANDED
    assert hops.sum() > WIDTH // 2
    t = lanes[row.TIME : row.TIME + WIDTH][hops]
    alive = 1.0 + np.flatnonzero(hops)
    life, lost, kept = (lanes[first : first + WIDTH] for first in (row.SUM_LIFE, row.SUM_LOST, row.KEPT))
    np.testing.assert_allclose(kept[hops], np.exp(-hazard * t), rtol=1e-13)
    np.testing.assert_allclose(life[hops], alive * -np.expm1(-hazard * t) / hazard, rtol=1e-13)
    np.testing.assert_allclose(lost[hops], alive * -np.expm1(-hazard * t), rtol=1e-12)
    assert not lost[~hops].any()
    assert not life[~hops].any()


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


@pytest.mark.skipif(not (FEATURES.get("avx2") and FEATURES.get("fma")), reason="needs x86 with AVX2")
@pytest.mark.parametrize(
    ("function", "arguments", "roots", "divisions", "fused"),
    [
        (fly_hops, (motion(),), 4, 7, 25),
        (hop_lanes._turn_ends, (1e-5,), 0, 0, 18),
        (sample_hops, (motion(), grid(), False), 0, 2, 8),
        (hop_lanes._set_velocities, (GM,), 0, 2, 3),
        (hop_lanes._decay, (1e-5,), 0, 0, 14),
        (hop_lanes._turn_samples, (1e-5, True), 0, 0, 36),
    ],
)
def test_hops_and_their_samples_are_vector_operations(function, arguments, roots, divisions, fused):
    # Machine code that comes from the cache can't be read.
    compiled = numba.njit(**OPTIONS, _nrt=False)(function.py_func)
    compiled(new_lanes(), *arguments)
    text = next(iter(compiled.inspect_asm().values()))
    assert len(re.findall(r"vsqrtpd\s.*ymm", text)) >= roots
    assert len(re.findall(r"vdivpd\s.*ymm", text)) >= divisions
    assert len(re.findall(r"vfn?m(?:add|sub)\d+pd\s.*ymm", text)) >= fused
