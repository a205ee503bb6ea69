"""A law of speed evaluated from responses is what a run with that law gives: trace once, ask later."""

import numpy as np
import pytest

from tracer.constants import ATOMIC_MASS
from tracer.observe.responses import BIAS, SCATTER, evaluate_law, speed_edges
from tracer.observe.spread import standard_error

GRAVITY = """
title = "Sodium over Harrow, any law of speed"
[body]
name = "Harrow"
radius = "1800 km"
gm = "9500 km3 s-2"
[gas]
species = "Na"
[[gas.loss]]
name = "charge exchange"
rate = "2e-5 s-1"
[[release]]
name = "vapour"
rate = "2e24 s-1"
speed = { law = "maxwell-flux", temperature = "1200 K" }
place = { law = "cosine-power", toward = "sun", power = 1 }
[surface]
temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }
sticking = 0.5
[domain]
outer_radius = "20 radii"
age_limit = "20 d"
[grid]
altitude = { first_cell = "50 km", top = "6 radii", cells = 4 }
latitude_cells = 4
local_time_cells = 6
[[image]]
name = "from north"
look_from = "north"
horizontal = ["-8 radii", "4 radii"]
vertical = ["-3 radii", "3 radii"]
pixels = [12, 6]
[ensemble]
particles_per_batch = 2000
batches = 40
replicates = 40
speed_bins = 32
"""
SUNLIT = GRAVITY.replace(
    "[gas]\n",
    """[sun]
distance = "0.35 au"
radial_velocity = "8 km/s"
[gas]
""",
    1,
).replace("particles_per_batch = 2000", "particles_per_batch = 800")
MOVING = SUNLIT.replace(
    'distance = "0.35 au"\nradial_velocity = "8 km/s"', 'true_anomaly = "60 deg"\nmotion = "moving"'
).replace(
    'gm = "9500 km3 s-2"', 'gm = "9500 km3 s-2"\norbit = { semi_major_axis = "0.4 au", eccentricity = 0.2 }'
)

LAWS = {
    "600 K": {"law": "maxwell-flux", "temperature": "600 K"},
    "1200 K": {"law": "maxwell-flux", "temperature": "1200 K"},
    "2400 K": {"law": "maxwell-flux", "temperature": "2400 K"},
    "sputtering": {"law": "sigmund-thompson", "binding_energy": "2 eV", "cutoff_energy": "500 eV"},
}


def with_law(text, law, seed=7):
    words = ", ".join(f'{key} = "{value}"' for key, value in law.items())
    return (
        text.replace('{ law = "maxwell-flux", temperature = "1200 K" }', "{ " + words + " }")
        .replace("speed_bins = 32", f"seed = {seed}")
        .replace("[ensemble]", '[ensemble]\nemphasis = "far"')
    )


def deviations(evaluated, direct):
    """Return differences over their errors where both are known to a fifth, all fields together."""
    found = []
    for name in map(str, direct.data_vars):
        if name not in evaluated or name + "_standard_error" not in direct:
            continue
        ours, theirs = evaluated[name].values[..., :], direct[name].values
        errors = [one[name + "_standard_error"].values for one in (evaluated, direct)]
        with np.errstate(invalid="ignore"):
            known = (errors[0] < 0.2 * np.abs(ours)) & (errors[1] < 0.2 * np.abs(theirs))
        found.append(((ours - theirs) / np.hypot(*errors))[known])
    return np.concatenate(found)


@pytest.mark.parametrize("law", LAWS)
@pytest.mark.parametrize("scene", ["gravity", "sunlit"])
def test_evaluated_law_agrees_with_a_run_of_it(traced, scene, law):
    text = {"gravity": GRAVITY, "sunlit": SUNLIT}[scene]
    evaluated = evaluate_law(traced(text), "vapour", LAWS[law])
    direct = traced(with_law(text, LAWS[law]))
    z = deviations(evaluated, direct)
    assert len(z) > 40
    # Up to 250 numbers with 39 degrees of freedom, neighbours move together: false alarm 1e-2 and less.
    assert np.abs(z).max() < 4.5
    assert 0.5 < np.mean(z**2) < 1.6
    for one in evaluated.data_vars.values():
        if "bias_over_error" in one.attrs:
            assert 0.0 < one.attrs["bias_over_error"] < 0.5


@pytest.mark.parametrize("scene", ["gravity", "sunlit"])
def test_wrong_temperature_would_show(traced, scene):
    text = {"gravity": GRAVITY, "sunlit": SUNLIT}[scene]
    warmer = evaluate_law(traced(text), 0, {"law": "maxwell-flux", "temperature": "1320 K"})
    z = deviations(warmer, traced(with_law(text, LAWS["1200 K"])))
    assert np.mean(z**2) > 3.0


def test_own_law_gives_the_run_its_own_fields(traced):
    product = traced(GRAVITY)
    z = deviations(evaluate_law(product, 0, LAWS["1200 K"]), product)
    assert len(z) > 40
    assert 0.5 < np.mean(z**2) < 1.6


def test_moving_body_gives_its_own_fields(traced):
    product = traced(MOVING.replace("particles_per_batch = 400", "particles_per_batch = 1000"))
    z = deviations(evaluate_law(product, 0, LAWS["1200 K"]), product)
    assert len(z) > 15
    assert np.abs(z).max() < 5.0
    assert 0.4 < np.mean(z**2) < 1.8


FREE = """
title = "Straight lines out of the ground"
body = { name = "Harrow", radius = "1000 km", gm = "0 km3 s-2" }
gas = { species = "Na" }
domain = { outer_radius = "10 radii" }
grid = { altitude = { first_cell = "50 km", top = "3 radii", cells = 4 }, latitude_cells = 1, local_time_cells = 1 }
ensemble = { particles_per_batch = 4000, batches = 10, replicates = 10, speed_bins = 16 }
surface = { sticking = 1.0 }
[[release]]
name = "upwards"
rate = "3e20 s-1"
speed = { law = "maxwell-flux", temperature = "1000 K" }
direction = { law = "normal" }
"""


def test_responses_of_straight_lines_are_exact(traced):
    product = traced(FREE)
    edges = speed_edges(product)
    # Atoms at speed v out to three radii more: the integral of (R/r)^2 dr is R (1 - 1/4); over the ground 4 pi R^2.
    per_slowness = 1e6 * 0.75 / (4.0 * np.pi * 1e12)
    low, high = edges[1:-1], edges[2:]
    mean = np.log(high / low) / (high - low)
    # x = (2 v - low - high)/(high - low), so that its mean with 1/v is (2 - (low + high) mean)/(high - low).
    weighted = (2.0 - (low + high) * mean) / (high - low)
    found = product.vertical_column_response.isel(release=0, launch_speed=slice(1, None)).values[..., 0, 0]
    error = product.vertical_column_response_standard_error.isel(
        release=0, launch_speed=slice(1, None)
    ).values
    z = (found - per_slowness * np.stack([mean, weighted], axis=1)) / error[..., 0, 0]
    # 30 numbers of Student's t with 9 degrees of freedom: false alarm 1e-2.
    assert np.abs(z).max() < 5.0
    assert np.max(np.abs(found[:, 0] / (per_slowness * mean) - 1.0)) < 0.02


def test_column_of_another_law_of_straight_lines_is_exact(traced):
    product = traced(FREE)
    for kelvin in (500.0, 2000.0):
        evaluated = evaluate_law(product, 0, {"law": "maxwell-flux", "temperature": kelvin})
        # Mean of 1/v of a flux-weighted Maxwellian: (sqrt(pi)/2) sqrt(m/2kT), by integration.
        slowness = 0.5 * np.sqrt(np.pi) / np.sqrt(2.0 * 1.380649e-23 * kelvin / (22.98977 * ATOMIC_MASS))
        expected = 3e20 * slowness * 1e6 * 0.75 / (4.0 * np.pi * 1e12)
        found = evaluated.vertical_column.item()
        error = evaluated.vertical_column_standard_error.item()
        assert abs(found - expected) < 5.0 * error
        assert found == pytest.approx(expected, rel=0.02)


def test_errors_are_those_of_the_replicates(traced):
    product = traced(GRAVITY)
    evaluated = evaluate_law(product, 0, LAWS["2400 K"])
    name = "column_from_north"
    batches = np.atleast_1d(product.attrs["replicate_batches"]).astype(float)
    again = standard_error(np.moveaxis(evaluated[name + "_replicates"].values, 0, -1), batches)
    scatter = evaluated[name + SCATTER].values
    known = np.isfinite(scatter)
    assert known.sum() > 40
    assert np.allclose(again[known], scatter[known], rtol=1e-12)
    mean = np.tensordot(batches, evaluated[name + "_replicates"].values, 1) / batches.sum()
    # Replicates are single precision in the product.
    assert np.allclose(mean, evaluated[name].values, rtol=1e-5, atol=1e-6 * np.abs(mean).max())


@pytest.mark.parametrize("kelvin", ["300 K", "600 K", "2400 K"])
def test_stated_error_holds_what_the_width_of_bins_does(traced, kelvin):
    evaluated = evaluate_law(traced(SUNLIT), 0, {"law": "maxwell-flux", "temperature": kelvin})
    reached = []
    for name in ("vertical_column", "column_from_north"):
        error, scatter, bias = (
            evaluated[name + ending].values for ending in ("_standard_error", SCATTER, BIAS)
        )
        known = np.isfinite(error)
        assert np.all(bias >= 0.0)
        assert np.array_equal(known, evaluated[name].values != 0.0)
        assert np.all(bias[~known] == 0.0)
        assert np.allclose(error[known], np.hypot(scatter, bias)[known], rtol=1e-14)
        assert np.all(bias[known] <= error[known])
        reached.append(evaluated[name].values[known])
    # Pixels that the cold law reaches by next to nothing are among them.
    every = np.abs(np.concatenate(reached))
    assert kelvin != "300 K" or every.min() < 1e-10 * every.max()
