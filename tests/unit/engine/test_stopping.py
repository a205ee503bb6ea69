"""Run until good enough: decided at 20, 40, 80, ... batches by the region's own scatter, whatever the timing."""

import random

import numpy as np
import pytest

from tracer.engine.batches import trace_batch
from tracer.engine.checkpoint_slots import Checkpoints
from tracer.engine.planning import make_plan
from tracer.engine.runspec.load import load_run, parse_run
from tracer.engine.runspec.writing import run_file_text
from tracer.engine.scene import build_scene
from tracer.engine.stopping import StopRule
from tracer.engine.tasks import BatchRange
from tracer.engine.tracing import run
from tracer.errors import InputError
from tracer.tally.axes import middles

SMALL = ["ensemble.particles_per_batch=20"]


def stop(variable: str, region: str = "", error: float = 0.5, most: int = 80) -> str:
    rule = f'variable = "{variable}", region = {{ {region} }}, relative_error = {error}, at_most_batches = {most}'
    return f"ensemble.stop={{ {rule} }}"


@pytest.fixture
def stopped(small_light_run_file):
    """Return a function that traces the small run in sunlight under a stop rule."""

    def trace(rule: str, **options):
        return run(load_run(small_light_run_file, [*SMALL, rule]), **{"workers": 1, **options})

    return trace


@pytest.fixture
def plan_of(small_light_run_file):
    def plan(rule: str, batches: BatchRange | None = None):
        spec = load_run(small_light_run_file, [*SMALL, rule])
        return make_plan(spec, build_scene(spec), batches)

    return plan


def test_decisions_fall_at_20_and_its_doubles_and_at_the_end():
    rule = StopRule(np.array([0]), None, 0.1, 100)
    assert [n for n in range(1, 101) if rule.is_due(n)] == [20, 40, 80, 100]


def test_the_error_is_that_of_the_mean_over_batches():
    rule = StopRule(np.array([0]), None, 0.1, 100)
    numbers = np.array([1.0, 2.0, 4.0, 5.0])
    # Mean 3, variance 10/3 of single batches, so 0.9129 for the mean of four.
    assert rule.relative_error_of(numbers) == pytest.approx(np.sqrt(10.0 / 3.0 / 4.0) / 3.0, rel=1e-14)
    assert rule.relative_error_of(np.zeros(4)) is None
    assert not rule.is_met(np.zeros(4))


@pytest.mark.parametrize(("error", "batches", "reached"), [(0.9, 20, 1), (0.001, 40, 0)])
def test_run_stops_when_it_is_good_enough_or_at_its_limit(stopped, error, batches, reached):
    product = stopped(stop("number_density", error=error, most=40))
    assert product.attrs["batches"] == batches
    assert product.attrs["stop_reached"] == reached
    assert (product.attrs["stop_relative_error"] <= error) == bool(reached)
    assert product.attrs["batch_ranges"] == f"seed 20310601 batches 0:{batches}"


def test_stopped_run_equals_the_run_of_as_many_batches(stopped, small_light_run_file):
    product = stopped(stop("number_density", error=0.9))
    plain = run(load_run(small_light_run_file, [*SMALL, "ensemble.batches=20"]), workers=1)
    assert product.attrs["data_checksum"] == plain.attrs["data_checksum"]
    assert product.attrs["run_hash"] == plain.attrs["run_hash"]
    assert product.attrs["flights"] == plain.attrs["flights"]


@pytest.mark.parametrize("order", [1, 2])
def test_the_decision_does_not_depend_on_the_timing(stopped, order):
    def shuffled(work, tasks, workers, tell, tick):
        # Batches beyond the decision arrive before it: they must be dropped.
        for task in random.Random(order).sample(tasks, len(tasks)):
            yield task, trace_batch(work, task, tell, lambda: False)

    rule = stop("number_density", error=0.9)
    product, expected = stopped(rule, executor=shuffled), stopped(rule)
    for name in ("data_checksum", "batches", "flights", "stop_relative_error"):
        assert product.attrs[name] == expected.attrs[name]


def test_the_error_of_the_region_is_that_of_its_mean_in_the_product(stopped):
    # 6 sectors of local time, two of them around noon; a share of the whole from 12 batches, as 12 groups of one.
    region = 'local_time = [8, 16], altitude = ["0 km", "1 radii"], latitude = ["-90 deg", "0 deg"]'
    product = stopped(stop("number_density", region, error=0.001, most=12), workers=2)
    assert product.attrs["batches"] == 12
    chosen = {"local_time": slice(8, 16), "altitude": slice(0.0, 1.8e6), "latitude": slice(-90, 0)}
    part = product.sel(**chosen)
    assert dict(part.sizes)["local_time"] == 2
    assert 0 < part.sizes["altitude"] < 5
    total = (part["number_density"] * part["cell_volume"]).sum()
    groups = (part["number_density_replicates"] * part["cell_volume"]).sum(
        ("release", "altitude", "latitude", "local_time")
    )
    assert groups.sizes["replicate"] == 3
    # The replicates know the error of three groups of four only: to some 50 %.
    rough = float(groups.std(ddof=1) / np.sqrt(3) / total)
    assert 0.2 < rough / product.attrs["stop_relative_error"] < 3.0


def test_the_error_of_the_region_is_exact_where_each_group_is_a_batch(small_light_run_file):
    region = 'local_time = [20, 4], release = "sputtering", line = "invented"'
    rule = stop("emission_rate", region, error=0.001, most=12)
    spec = load_run(small_light_run_file, [*SMALL, rule, "ensemble.replicates=12"])
    product = run(spec, workers=1)
    night = (product.local_time >= 20) | (product.local_time <= 4)
    part = product["emission_rate_replicates"].sel(release="sputtering", line="invented")
    groups = (part * product["cell_volume"]).where(night, 0.0).sum(("altitude", "latitude", "local_time"))
    expected = float(groups.std(ddof=1) / np.sqrt(12) / groups.mean())
    # Replicates are kept in single precision.
    assert product.attrs["stop_relative_error"] == pytest.approx(expected, rel=1e-5)


def test_the_region_of_an_image_is_chosen_by_its_pixels(plan_of):
    region = 'horizontal = ["-5 radii", "-2 radii"], vertical = ["-1 radii", "1 radii"]'
    plan = plan_of(stop("column_tail_from_north", region))
    plane = plan.scene.planes[0]
    columns = middles(plane.horizontal_edges) / 1.8e6
    rows = middles(plane.vertical_edges) / 1.8e6
    expected = ((columns >= -5) & (columns <= -2)).sum() * ((rows >= -1) & (rows <= 1)).sum()
    assert len(plan.rule.places) == expected > 0


@pytest.mark.parametrize("kept", [7, 19])
def test_resumed_run_decides_as_the_uninterrupted_run(stopped, tmp_path, kept):
    rule = stop("vertical_column", error=0.9)
    first = Checkpoints(tmp_path / "out.nc")

    def watch(status):
        if status.batches >= kept:
            raise RuntimeError

    with pytest.raises(RuntimeError):
        stopped(rule, watch=watch, checkpoints=first)
    assert kept <= first.kept_batches < 20
    resumed = stopped(rule, checkpoints=Checkpoints(tmp_path / "out.nc", resume=True))
    expected = stopped(rule)
    for name in ("data_checksum", "batches", "stop_relative_error"):
        assert resumed.attrs[name] == expected.attrs[name]
    with pytest.raises(InputError, match=r"was made with another ensemble\.stop"):
        stopped(stop("vertical_column", error=0.8), checkpoints=Checkpoints(tmp_path / "out.nc", resume=True))


def test_a_share_of_a_run_that_decides_its_own_end_is_refused(plan_of):
    with pytest.raises(
        InputError, match=r"ensemble.stop: decides over the whole run, which no share can know"
    ):
        plan_of(stop("number_density"), BatchRange(0, 5))


def test_the_rule_survives_writing_the_run_file(small_light_run_file):
    region = 'local_time = [18, 6], altitude = ["0 km", "1 radii"], release = "sputtering"'
    spec = load_run(small_light_run_file, [stop("number_density", region)])
    assert parse_run(run_file_text(spec), "run file") == spec
    assert spec.ensemble.most_batches == 80


@pytest.mark.parametrize(
    ("rule", "message"),
    [
        (
            stop("number_densty"),
            'ensemble.stop.variable: "number_densty" is not tallied here; one of number_density, vertical_column, '
            "column_tail_from_north, emission_rate, brightness_tail_from_north, release_flux, return_flux, "
            "capture_flux, escape_flux, escape_rate_by_direction, ionization_rate",
        ),
        (
            stop("number_density", 'release = "vent"'),
            'ensemble.stop.region.release: "vent" is none of this run\'s: impact vapour, sputtering',
        ),
        (
            stop("vertical_column", 'altitude = ["0 km", "10 km"]'),
            "ensemble.stop.region.altitude: vertical_column has none; allowed: release, latitude, local_time",
        ),
        (
            stop("emission_rate"),
            "ensemble.stop.region.line: missing; emission_rate has one value for each line",
        ),
        (
            stop("emission_rate", 'line = "na_d3"'),
            'ensemble.stop.region.line: "na_d3" is none of this run\'s: ',
        ),
        (
            stop("number_density", 'altitude = ["1 km", "2 km"]'),
            "ensemble.stop.region: holds the middle of no cell; widen it",
        ),
        (
            stop("number_density", 'altitude = ["2000 km", "1 radii"]'),
            "ensemble.stop.region.altitude: must rise, and goes from 2e+06 to 1.8e+06 m",
        ),
    ],
)
def test_a_rule_that_does_not_fit_the_run_is_refused(plan_of, rule, message):
    with pytest.raises(InputError) as refusal:
        plan_of(rule)
    assert str(refusal.value).partition(": ")[2].startswith(message)


@pytest.mark.parametrize(
    ("rule", "message"),
    [
        (
            stop("number_density", error=0.0),
            "ensemble.stop.relative_error: 0.0 is out of range; must be a number above 0 and below 1",
        ),
        (
            stop("number_density", most=1),
            "ensemble.stop.at_most_batches: 1 is out of range; must be a whole number at least 2",
        ),
        (
            stop("number_density", 'latitude = ["30 deg", "10 deg"]'),
            'ensemble.stop.region.latitude: ["30 deg", "10 deg"] is no range; the first must be below the second',
        ),
        (
            stop("number_density", "local_time = [6, 6]"),
            "ensemble.stop.region.local_time: [6, 6] is no range; must differ",
        ),
        (
            stop("number_density", "local_tme = [6, 12]"),
            "ensemble.stop.region.local_tme: unknown key; did you mean local_time?",
        ),
        (
            stop("number_density", "altitude = [0, 100]"),
            'ensemble.stop.region.altitude[1]: 0 has no unit; write for example "10 radii"',
        ),
    ],
)
def test_a_rule_that_is_none_is_refused(small_light_run_file, rule, message):
    with pytest.raises(InputError) as refusal:
        load_run(small_light_run_file, [rule])
    assert str(refusal.value).partition(": ")[2].startswith(message)


def test_a_rule_may_ask_for_atoms_at_rest_where_there_are_any(small_run_file):
    rule = stop("adsorbed_column", 'latitude = ["-90 deg", "0 deg"]', error=0.5)
    with pytest.raises(InputError, match=r'"adsorbed_column" is not tallied here'):
        run(load_run(small_run_file, [*SMALL, rule]), workers=1)
    held = 'surface.desorption={ energy = "0.2 eV", attempt_frequency = "1e13 s-1" }'
    spec = load_run(small_run_file, [*SMALL, rule, "surface.adsorbed=desorbed", held])
    assert run(spec, workers=1).attrs["stop_relative_error"] > 0.0
