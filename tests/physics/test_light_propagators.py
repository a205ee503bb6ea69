"""Closed-form arcs and integrated flights give the same answer in a turning frame, where both apply."""

import numpy as np
import pytest

from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene
from tracer.engine.single_flight import Launch, fly

SUN = '[sun]\ndistance = "0.1 au"\ntide = false\n'
"""So near the Sun that the frame turns by 1.3 degrees an hour."""

RUN = """
title = "two ways to one answer"
[body]
name = "Ball"
radius = "1737.4 km"
gm = "4902.8 km3 s-2"
rotation_period = "100 h"
{sun}
[gas]
species = "He"
photoionization_rate = "{photo} s-1"
{loss}
[[release]]
name = "vent"
rate = "1e20 s-1"
speed = {{ law = "single", speed = "2.2 km/s" }}
direction = {{ law = "cosine" }}
place = {{ law = "patch", latitude = "20 deg", local_time = 12.0, radius = "400 km" }}
[surface]
sticking = 0.4
accommodation = 0.3
temperature = {{ law = "uniform", value = "900 K" }}
[domain]
outer_radius = "30 radii"
age_limit = "{age}"
[grid]
altitude = {{ first_cell = "1 radii", top = "4 radii", cells = 3 }}
latitude_cells = 3
local_time_cells = 8
[[image]]
name = "north"
look_from = "north"
horizontal = ["-4 radii", "4 radii"]
vertical = ["-4 radii", "4 radii"]
pixels = [6, 6]
[ensemble]
particles_per_batch = 150
batches = 80
seed = {seed}
replicates = 0
"""
LOSS = '[[gas.loss]]\nname = "charge exchange"\nrate = "5e-6 s-1"'
VANISHING = "1e-30"
"""A photo-loss that takes nothing and yet must be integrated."""


def run_text(*, photo="0", sun=SUN, age="30 d", seed=1, loss=LOSS):
    return RUN.format(photo=photo, sun=sun, age=age, seed=seed, loss=loss)


def scene(**changes):
    return build_scene(parse_run(run_text(**changes), "run file"))


def launches(count, low, high):
    rng = np.random.default_rng(20)
    return [
        Launch(
            float(np.degrees(np.arcsin(rng.uniform(-1.0, 1.0)))),
            float(rng.uniform(0.0, 24.0)),
            float(rng.uniform(low, high)),
            float(np.degrees(np.arcsin(np.sqrt(rng.uniform(0.0, 0.99))))),
            float(rng.uniform(0.0, 360.0)),
        )
        for _ in range(count)
    ]


def differences(one, other, launched):
    """Greatest differences of end place [radii], velocity and time (relative), apex [radii], survival."""
    radius = one.body.radius
    rows = []
    for launch in launched:
        a, b = fly(one, launch), fly(other, launch)
        assert a.summary.fate == b.summary.fate
        end, same = a.path[-1], b.path[-1]
        rows.append(
            (
                np.linalg.norm(end[3:6] - same[3:6]) / radius,
                np.linalg.norm(end[6:9] - same[6:9]) / np.linalg.norm(end[6:9]),
                abs(same[0] / end[0] - 1.0),
                abs(a.summary.apex_altitude - b.summary.apex_altitude) / radius,
                abs(end[1] - same[1]),
            )
        )
    return np.array(rows)


@pytest.mark.parametrize(
    ("speeds", "age"),
    # Hops, flights of many hours, escapes; and flights that the age limit cuts.
    [
        ((300.0, 2000.0), "1 yr"),
        ((2000.0, 2320.0), "1 yr"),
        ((2400.0, 3500.0), "1 yr"),
        ((2000.0, 2600.0), "1 h"),
    ],
)
def test_flights_end_in_the_same_place_at_the_same_time(speeds, age):
    arcs, integrated = scene(age=age), scene(age=age, photo=VANISHING)
    assert (arcs.integrated, integrated.integrated) == (False, True)
    assert differences(arcs, integrated, launches(25, *speeds)).max() < 1e-7


def test_flights_in_a_frame_that_does_not_turn_end_elsewhere():
    still = scene(sun="")
    assert not still.integrated
    assert np.median(differences(still, scene(photo=VANISHING), launches(25, 2000.0, 2320.0))[:, 0]) > 0.01


def deviations(one, other):
    """Differences between two products in standard errors, over all cells, pixels and numbers that both know well."""
    found = []
    for name in one.data_vars:
        error = f"{name}_standard_error"
        if error in one:
            spread = np.hypot(one[error].values, other[error].values)
            both = one[name].values + other[name].values
            known = (spread > 0.0) & (spread < 0.1 * both)
            found.append((one[name].values - other[name].values)[known] / spread[known])
    return np.concatenate(found)


def test_whole_runs_agree(traced):
    arcs, integrated = traced(run_text(seed=1)), traced(run_text(seed=2, photo=VANISHING))
    assert arcs.attrs["integration_steps"] == 0 < integrated.attrs["integration_steps"]
    apart = deviations(arcs, integrated)
    # 217 comparisons at 4.8 standard errors of 158 degrees of freedom: false alarm 8e-4. Neighbours move together: the
    # mean square scatters by 0.12 from seed to seed, false alarm 1e-2.
    assert apart.size > 200
    assert np.abs(apart).max() < 4.8
    assert 0.7 < np.mean(apart**2) < 1.3


def test_whole_runs_in_a_frame_that_does_not_turn_differ(traced):
    assert (
        np.abs(deviations(traced(run_text(seed=1, sun="")), traced(run_text(seed=2, photo=VANISHING)))).max()
        > 8.0
    )


def test_budgets_of_the_same_launches_differ_by_the_propagators_errors_alone(traced):
    once = [
        text.replace("sticking = 0.4", "sticking = 1.0") for text in (run_text(), run_text(photo=VANISHING))
    ]
    arcs, integrated = (traced(text).ledger.sel(release="vent") for text in once)
    assert arcs.sel(fate="other_loss") > 1e18
    assert integrated.sel(fate="ionized") < 1e-3
    np.testing.assert_allclose(integrated.values, arcs.values, rtol=1e-6, atol=1e-3)
