"""Flights side by side are the flights that an atom makes alone."""

import math
import re

import llvmlite.binding as llvm
import numba
import numpy as np
import pytest

from tracer.engine.batches import make_work
from tracer.engine.launching import draw_launches
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.fate import Fate
from tracer.kernels import lanes as row
from tracer.kernels.compiling import OPTIONS
from tracer.kernels.endings import CROSSED, LANDED
from tracer.kernels.integrated_flight import HAZARDS, PLACE, TIME, fly, new_curve, new_flight, start_flight
from tracer.kernels.lane_flight import launch_in_lane, step_lanes
from tracer.kernels.lane_sample import MOST_SAMPLES, go_on, sample_of, sample_steps, survival
from tracer.kernels.lane_step import try_steps
from tracer.kernels.lanes import WIDTH, new_lanes
from tracer.kernels.lookups import look_up_four
from tracer.kernels.resume import ENDED, STEPS, new_resume
from tracer.kernels.step_control import inverse_root, step_change
from tracer.kernels.tracing import trace_slice
from tracer.tally.buffer import tally_views

FEATURES = llvm.get_host_cpu_features()

SCENE = """title = "Flights"
[body]
name = "Mercury"

[sun]
true_anomaly = "60 deg"
shadow = "{shadow}"

[gas]
species = "{species}"
{gas}
[[release]]
name = "ground"
rate = "1 s-1"
speed = {{ law = "maxwell-flux", temperature = "{temperature} K" }}

[surface]
sticking = 1.0

[domain]
outer_radius = "8 radii"
age_limit = "{age_limit}"
"""

LOSSES = """
[[gas.loss]]
name = "in light"
rate = "3e-5 s-1"
scaling = "constant"
where = "sunlight"

[[gas.loss]]
name = "near the Sun"
rate = "1e-5 s-1"
scaling = "inverse-square"
where = "everywhere"

[[gas.loss]]
name = "always"
rate = "1e-4 s-1"
scaling = "constant"
where = "everywhere"
"""

LASTING = 'photoionization_rate = "0 s-1"\n'

UNEVEN_LINES = "".join(
    f'\n[[gas.line]]\nname = "line {n}"\nwavelength = "500 nm"\ng = {{{{ file = "g{n}.csv" }}}}\n'
    for n in range(3)
)


def scene_of(tmp_path, shadow="penumbra", species="Na", gas="", temperature=1500, age_limit="2 h"):
    text = SCENE.format(shadow=shadow, species=species, gas=gas, temperature=temperature, age_limit=age_limit)
    file = tmp_path / "run.toml"
    file.write_text(text, encoding="utf-8")
    return build_scene(load_run(file))


def traced(scene, count, budgets=(10**9,)):
    """Trace `count` atoms that stick where they land, and return (work, launches, tally, flights)."""
    work = make_work(scene, 1, count)
    launches = draw_launches(scene, scene.releases[0], count, np.random.default_rng(3), 1.0)
    buffer = np.zeros(work.layout.size)
    tally = tally_views(work.layout, buffer)
    resume, rng, flights = new_resume(len(scene.lines)), np.random.default_rng(4), 0
    while resume.counters[ENDED] < count:
        budget = budgets[flights % len(budgets)]
        made = trace_slice(work.world, launches, resume, tally, rng, budget)
        assert 0 < made <= budget
        flights += made
    return work, launches, tally, flights


def alone(work, launches):
    """Return (ending, time, x, y, z, survival) of each launch, flown by itself, shape (n, 6)."""
    world, scene = work.world, work.scene
    places = world.motion.radius * launches.positions
    turned = world.surface.spin * np.column_stack([-places[:, 1], places[:, 0], np.zeros(len(places))])
    conditions, tolerance = world.light.conditions, world.light.tolerance
    flight, curve, ends = new_flight(), new_curve(), []
    for place, velocity in zip(places, launches.velocities + turned, strict=True):
        start_flight(flight, conditions, tolerance, *place, *velocity)
        ending = fly(flight, curve, conditions, tolerance, scene.age_limit)
        kept = math.exp(-flight[HAZARDS] - flight[HAZARDS + 1])
        ends.append((ending, flight[TIME], *flight[PLACE : PLACE + 3], kept))
    return np.array(ends)


@pytest.mark.parametrize(
    "case",
    [
        {},
        {"gas": LOSSES, "shadow": "cylinder"},
        {"gas": LOSSES, "temperature": 3000},
        {"shadow": "none", "age_limit": "15 min"},
        {"species": "Ar"},
    ],
)
def test_flights_in_lanes_end_like_flights_alone(tmp_path, case):
    count = 400
    work, launches, tally, flights = traced(scene_of(tmp_path, **case), count)
    ends = alone(work, launches)
    ending, kept = ends[:, 0], ends[:, 5]
    assert flights == count
    # The lengths of steps differ by rounding, so landings do within the tolerance: 1e-6 radii for half of them.
    assert tally.returned.sum() == pytest.approx(kept[ending == LANDED].sum(), rel=1e-6)
    assert tally.ledger[Fate.CAPTURED] == pytest.approx(kept[ending == LANDED].sum(), rel=1e-6)
    assert tally.ledger[Fate.ESCAPED] == pytest.approx(kept[ending == CROSSED].sum(), rel=1e-6, abs=1e-9)
    assert tally.ledger[Fate.UNRESOLVED] == 0.0
    assert tally.ledger.sum() == pytest.approx(count, rel=1e-12)
    rows = np.degrees(np.arcsin(ends[:, 4] / np.linalg.norm(ends[:, 2:5], axis=1)))
    expected, _ = np.histogram(
        rows[ending == LANDED],
        bins=np.linspace(-90.0, 90.0, tally.returned.shape[0] + 1),
        weights=kept[ending == LANDED],
    )
    np.testing.assert_allclose(tally.returned.sum(axis=1), expected, rtol=1e-5, atol=1e-9)


def test_residence_time_is_that_of_flights_alone(tmp_path):
    # Without losses the samples' weights are the flights' durations, whatever the random numbers.
    work, launches, tally, _ = traced(scene_of(tmp_path, gas=LASTING), 300)
    duration = alone(work, launches)[:, 1].sum()
    assert tally.life[0] == pytest.approx(duration, rel=1e-6)


def test_more_pushing_lines_than_lanes_look_up_at_once(tmp_path):
    for n, shift in enumerate((0.0, 0.3, 0.7)):
        rows = "\n".join(f"{v + shift},{0.3 + 0.02 * n + 0.01 * v}" for v in range(-20, 21, 4 - n))
        (tmp_path / f"g{n}.csv").write_text(f"radial velocity in km/s,g in 1/s\n{rows}\n", encoding="utf-8")
    gas = 'mass = "23 u"\n' + UNEVEN_LINES.format()
    scene = scene_of(tmp_path, species="Invented", gas=gas)
    work, launches, tally, _ = traced(scene, 200)
    assert work.world.light.conditions.push_tables[0] == 3.0
    ends = alone(work, launches)
    assert tally.life[0] == pytest.approx(ends[:, 1].sum(), rel=1e-6)
    dark = work.world.light.conditions._replace(push_tables=np.zeros(3))
    calm = alone(
        work._replace(world=work.world._replace(light=work.world.light._replace(conditions=dark))), launches
    )
    assert abs(calm[:, 1].sum() / ends[:, 1].sum() - 1.0) > 1e-3


@pytest.mark.parametrize("count", [1, 3, WIDTH + 1])
def test_few_atoms_fly_as_well(tmp_path, count):
    work, launches, tally, flights = traced(scene_of(tmp_path, gas=LASTING), count)
    assert flights == count
    assert tally.life[0] == pytest.approx(alone(work, launches)[:, 1].sum(), rel=1e-6)


def test_slices_of_any_length_count_the_same(small_light_run_file):
    scene = build_scene(load_run(small_light_run_file))
    results = []
    for budgets in ((10**9,), (1,), (3, 50, 1)):
        work = make_work(scene, 1, 60)
        _, _, tally, flights = traced(scene, 60, budgets)
        results.append((flights, np.concatenate([np.ravel(field) for field in tally])))
        assert len(results[-1][1]) == work.layout.size
    for flights, counted in results[1:]:
        assert flights == results[0][0]
        assert np.array_equal(counted, results[0][1])


def test_a_slice_that_stops_has_counted_its_steps(small_light_run_file):
    # The pilot of far launches, which gives up long lives, weighs them by their steps.
    scene = build_scene(load_run(small_light_run_file))
    steps = []
    for budget in (10**9, 1):
        work = make_work(scene, 1, 60)
        launches = draw_launches(scene, scene.releases[0], 60, np.random.default_rng(3), 1.0)
        tally = tally_views(work.layout, np.zeros(work.layout.size))
        resume, rng = new_resume(len(scene.lines)), np.random.default_rng(4)
        trace_slice(work.world, launches, resume, tally, rng, budget)
        early = resume.counters[STEPS]
        while resume.counters[ENDED] < 60:
            trace_slice(work.world, launches, resume, tally, rng, budget)
        steps.append((early, resume.counters[STEPS]))
    assert steps[0][1] == steps[1][1] == steps[0][0] > steps[1][0] > WIDTH


@pytest.mark.parametrize("hazard", [0.0, 1e-9, 1e-3, 0.3, 0.4999, 0.5, 2.0, 30.0, 500.0])
def test_survival_of_a_step(hazard):
    mean, left = survival(hazard)
    assert left == pytest.approx(math.exp(-hazard), rel=1e-12)
    assert mean == pytest.approx(-math.expm1(-hazard) / hazard if hazard else 1.0, rel=1e-14)


def test_roots_from_bits():
    for value in np.geomspace(1e-11, 1e29, 200):
        assert inverse_root(value) == pytest.approx(value**-0.5, rel=2e-3)
        assert step_change(value) == pytest.approx(min(5.0, max(0.2, 0.9 * value**-0.1)), rel=5e-3)
    assert step_change(0.0) == 5.0
    assert step_change(math.inf) == step_change(math.nan) == 0.2


def test_a_step_is_sampled_once_for_each_of_its_even_parts(tmp_path):
    """The first sample, taken in all lanes at once, is what `sample_of` gives; all add up to the step's duration."""
    work = make_work(scene_of(tmp_path, species="Ar", gas=LOSSES), 1, WIDTH)
    sky, tables = work.world.light.conditions
    lanes = new_lanes()
    rng = np.random.default_rng(5)
    for lane in range(WIDTH):
        # From near the ground to where steps are long.
        r = work.scene.body.radius * 1.02 * 1.05**lane
        place = (r, 0.1 * r, 0.2 * r, 300.0, 1200.0, -400.0)
        launch_in_lane(lanes, lane, work.world.light.conditions, 1e-3, 0.0, 1e7, place)
        lanes[row.ALIVE + lane] = 1.0 + lane
        lanes[row.DRAWN + lane] = rng.random()
    # The first steps are short everywhere; some lanes' flights end on the way.
    for _ in range(8):
        step_lanes(lanes, sky, tables, new_curve())
        sample_steps(lanes, sky, work.world.cells)
        go_on(lanes)
    step_lanes(lanes, sky, tables, new_curve())
    sample_steps(lanes, sky, work.world.cells)
    samples = lanes[row.SAMPLES : row.SAMPLES + WIDTH]
    flown = np.flatnonzero(lanes[row.ACCEPTED : row.ACCEPTED + WIDTH])
    assert len(flown) > WIDTH // 4
    assert samples[flown].min() < 4.0 < samples[flown].max() <= MOST_SAMPLES
    for lane in flown:
        x, y, z, velocity, content = sample_of(lanes, lane, sky.losses, 0)
        places = [lanes[row.SAMPLE + axis * WIDTH + lane] for axis in range(3)]
        velocities = [lanes[row.SAMPLE_VELOCITY + axis * WIDTH + lane] for axis in range(3)]
        assert (x, y, z) == pytest.approx(places, rel=1e-14)
        assert velocity == pytest.approx(velocities, rel=1e-12)
        assert content == pytest.approx(lanes[row.CONTENT + lane], rel=1e-13)
        contents = [sample_of(lanes, lane, sky.losses, n)[4] for n in range(int(samples[lane]))]
        # The integral of the survival by its values at even spaces: off by what it loses in one of them.
        life = lanes[row.LIFE + lane]
        decay = abs(contents[0] - contents[-1]) + abs(contents[0]) * lanes[row.LENGTH + lane] * 1e-4
        assert sum(contents) == pytest.approx(life, abs=decay)


def test_samples_of_flights_hold_their_residence_time(tmp_path):
    # All samples lie in the grid, which ends with the domain; without losses their weights add up exactly.
    _, _, tally, _ = traced(scene_of(tmp_path, gas=LASTING, temperature=6000), 400)
    assert tally.content.sum() == pytest.approx(tally.life[0], rel=1e-9)


def test_samples_of_a_flight_lie_evenly_over_its_steps():
    # Fractional parts of u + n golden: even for each step, and any few in a row spread over the unit interval.
    lanes = new_lanes()
    lanes[row.DRAWN : row.DRAWN + WIDTH] = 0.25
    lanes[row.ACCEPTED : row.ACCEPTED + WIDTH] = 1.0
    lanes[row.ACCEPTED] = 0.0
    drawn = []
    for _ in range(8):
        go_on(lanes)
        drawn.append(lanes[row.DRAWN + 1])
    assert lanes[row.DRAWN] == 0.25
    expected = [(0.25 + n * (math.sqrt(5.0) - 1.0) / 2.0) % 1.0 for n in range(1, 9)]
    assert drawn == pytest.approx(expected, rel=1e-12)
    assert np.diff(np.sort(drawn)).max() < 0.2


def test_lines_looked_up_four_at_a_time():
    rng = np.random.default_rng(6)
    tables, lanes = rng.normal(size=60), np.zeros(12)
    knots = rng.integers(0, 59, 4)
    lanes[:4] = knots.view(np.float64)
    lanes[4:8] = rng.uniform(0.0, 30.0, 4)
    compiled = lanes.copy()
    look_up_four(lanes, tables, 0, 4, 8)
    _look_up(compiled, tables)
    expected = tables[knots] + lanes[4:8] * tables[knots + 1]
    np.testing.assert_allclose(lanes[8:], expected, rtol=1e-14)
    np.testing.assert_allclose(compiled[8:], expected, rtol=1e-13, atol=1e-14)


@numba.njit
def _look_up(lanes, tables):
    look_up_four(lanes, tables, 0, 4, 8)


@pytest.mark.skipif(not (FEATURES.get("avx2") and FEATURES.get("fma")), reason="needs x86 with AVX2")
def test_steps_are_vector_operations(small_light_run_file):
    world = make_work(build_scene(load_run(small_light_run_file)), 1, 1).world
    conditions = world.light.conditions
    for function, arguments, (roots, divisions) in (
        # Two roots and a division in each of six stages, and in what follows: a loop that is left out shows.
        (try_steps, (new_lanes(), conditions.sky, conditions.push_tables), (14, 7)),
        (sample_steps, (new_lanes(), conditions.sky, world.cells), (4, 5)),
    ):
        # Machine code that comes from the cache can't be read.
        compiled = numba.njit(**OPTIONS, _nrt=False)(function.py_func)
        compiled(*arguments)
        text = next(iter(compiled.inspect_asm().values()))
        assert len(re.findall(r"vsqrtpd\s.*ymm", text)) >= roots
        assert len(re.findall(r"vdivpd\s.*ymm", text)) >= divisions
        assert len(re.findall(r"vfn?m(?:add|sub)\d+pd\s.*ymm", text)) >= 50
