"""The strata of emphasis "far": how deep, how many, for which laws, and the same everywhere."""

import numpy as np
import pytest

from tracer.engine import emphasis
from tracer.engine.batches import make_work
from tracer.engine.emphasis import (
    EVEN_SHARE,
    LAUNCHES_PER_STRATUM,
    MOST_STRATA,
    RAREST,
    far_strata,
    rarest_launch,
    speed_edges,
    with_emphasis,
)
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
from tracer.engine.tracing import run
from tracer.errors import InputError

FAR = "ensemble.emphasis=far"


@pytest.fixture(scope="module")
def scene(small_run_file):
    return build_scene(load_run(small_run_file, [FAR]))


@pytest.fixture(scope="module")
def strata(scene):
    return far_strata(scene, scene.releases[0], 20_000)


def test_strata_fill_the_cube_and_hold_all_launches(strata):
    assert strata.boxes.probabilities.sum() == pytest.approx(1.0, abs=1e-13)
    assert strata.counts.sum() == 20_000
    assert 3 < len(strata.counts) <= MOST_STRATA


def test_no_stratum_gets_less_than_the_even_share(strata):
    even = EVEN_SHARE * strata.boxes.probabilities * (20_000 - len(strata.counts))
    assert np.all(strata.counts >= np.floor(even))


def test_fast_launches_are_denser_than_slow_ones(scene, strata):
    # Coordinate 2 counts from the fast end.
    density = strata.counts / strata.boxes.probabilities
    fast = strata.boxes.low[:, 2] + strata.boxes.width[:, 2] <= rarest_launch(scene, scene.releases[0])
    slow = strata.boxes.low[:, 2] >= 0.25
    assert fast.any()
    assert slow.any()
    assert density[fast].min() > 2.0 * np.average(density[slow], weights=strata.boxes.probabilities[slow])


def test_few_particles_have_few_strata_and_one_has_one(scene):
    for particles in (1, 31, 63, 64, 250):
        strata = far_strata(scene, scene.releases[0], particles)
        assert strata.counts.sum() == particles
        assert len(strata.counts) <= max(1, particles // LAUNCHES_PER_STRATUM)


def test_pilot_ends_at_its_budget_with_as_many_atoms_from_each_box(scene, monkeypatch):
    edges = speed_edges(rarest_launch(scene, scene.releases[0]), 16)
    boxes = emphasis._speed_boxes(edges)
    whole = emphasis.fly_pilot(scene, scene.releases[0], boxes)
    monkeypatch.setattr(emphasis, "PILOT_BUDGET", 1)
    short = emphasis.fly_pilot(scene, scene.releases[0], boxes)
    assert np.all(np.bincount(short.box) == emphasis.LEAST_PILOT_ROUNDS)
    assert np.all(np.bincount(whole.box) > 2 * emphasis.LEAST_PILOT_ROUNDS)
    assert {tuple(point) for point in short.points} <= {tuple(point) for point in whole.points}


@pytest.mark.parametrize(
    ("law", "rarest"),
    [
        # All atoms are alike: no strata of speed.
        ('{ law = "single", speed = "1 km/s" }', 1.0),
        # (1 + lambda) exp(-lambda) at lambda 11.3 of Harrow is 1.5e-4: the next power of 1/4 below.
        ('{ law = "maxwell-flux", temperature = "1290 K" }', 4.0**-7),
        # lambda 145: nothing escapes.
        ('{ law = "maxwell-flux", temperature = "100 K" }', 4.0**-20),
    ],
)
def test_speeds_are_told_apart_down_to_escape(small_run_file, law, rarest):
    scene = build_scene(load_run(small_run_file, [f"release[1].speed={law}"]))
    assert rarest_launch(scene, scene.releases[0]) == rarest
    assert rarest > RAREST / 4.0


def test_speed_edges_fall_from_one_to_zero():
    edges = speed_edges(4.0**-6, 100)
    np.testing.assert_allclose(edges, [4.0**-k for k in range(7)] + [0.0])
    np.testing.assert_allclose(speed_edges(4.0**-6, 4), [1.0, 4.0**-2, 4.0**-4, 4.0**-6, 0.0])
    assert speed_edges(1.0, 100).tolist() == [1.0, 0.0]


def test_even_emphasis_changes_nothing(small_run_file):
    work = make_work(build_scene(load_run(small_run_file)), 1, 500)
    assert with_emphasis(work) is work


def test_product_of_emphasis_far_does_not_depend_on_the_workers(small_light_run_file, monkeypatch):
    monkeypatch.setattr(emphasis, "PILOT_ATOMS", 1024)
    spec = load_run(small_light_run_file, [FAR])
    one, other = run(spec, workers=1), run(spec, workers=3)
    assert one.attrs["data_checksum"] == other.attrs["data_checksum"]
    even = run(load_run(small_light_run_file), workers=1)
    assert one.attrs["data_checksum"] != even.attrs["data_checksum"]
    # What is released does not depend on it: the weights sum to the rate.
    assert one.ledger.sum().item() == pytest.approx(even.ledger.sum().item(), rel=1e-12)


def test_body_without_gravity_and_a_batch_of_one_run(small_run_file):
    spec = load_run(
        small_run_file,
        [
            FAR,
            "body.gm=0 km3 s-2",
            "ensemble.particles_per_batch=1",
            "ensemble.batches=2",
            "ensemble.replicates=0",
        ],
    )
    assert run(spec, workers=1).ledger.sum().item() == pytest.approx(2.5e24, rel=1e-12)


def test_another_emphasis_is_refused(small_run_file):
    with pytest.raises(InputError, match=r'ensemble.emphasis: "fra" .*"even" or "far"'):
        load_run(small_run_file, ["ensemble.emphasis=fra"])
