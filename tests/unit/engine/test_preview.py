"""The figures of `check` against what a run then does."""

import numpy as np
import pytest

from tracer.engine.preview import preview
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene
from tracer.engine.tracing import run

FAST_ROTATOR = """
title = "Argon over a fast rotator"
body = { name = "Top", radius = "261 km", gm = "17.3 km3 s-2", rotation_period = "5.3 h" }
gas = { species = "Ar" }
surface = { sticking = 1.0 }
domain = { outer_radius = "5 radii" }
grid = { altitude = { cells = 3, top = "3 radii" }, latitude_cells = 4, local_time_cells = 6 }
ensemble = { particles_per_batch = 4000, batches = 10 }
[[release]]
name = "ground"
rate = "1e20 s-1"
speed = { law = "maxwell-flux", temperature = "150 K" }
"""


def test_crossing_fraction_of_check_is_that_of_the_run_on_a_fast_rotator():
    spec = parse_run(FAST_ROTATOR, "top.toml")
    expected = preview(spec, build_scene(spec), 1).releases[0].crossing_fraction
    product = run(spec, workers=1)
    escaped = product.ledger.sel(release="ground", fate="escaped")
    error = float(product.ledger_standard_error.sel(release="ground", fate="escaped")) / 1e20
    trial_error = np.sqrt(expected * (1.0 - expected) / 20_000)
    # False alarm 6e-5.
    assert abs(float(escaped) / 1e20 - expected) < 4.0 * np.hypot(error, trial_error)
    still = parse_run(FAST_ROTATOR.replace('"5.3 h"', '"5.3e6 h"'), "still.toml")
    assert preview(still, build_scene(still), 1).releases[0].crossing_fraction < expected - 4.0 * trial_error


def test_launch_speed_at_the_grounds_temperature_is_the_mean_over_the_ground():
    text = FAST_ROTATOR.replace('temperature = "150 K"', 'temperature = "surface"').replace(
        "surface = { sticking = 1.0 }",
        'surface = { sticking = 1.0, temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" } }',
    )
    spec = parse_run(text, "top.toml")
    found = preview(spec, build_scene(spec), 1).releases[0].launch_speed
    # Mean of (3 sqrt(pi)/4) sqrt(2kT/m) over the sphere; by day cos(solar zenith angle) is even in [0, 1].
    mass, boltzmann = 39.9623831 * 1.66053906892e-27, 1.380649e-23
    cosines = (np.arange(10_000) + 0.5) / 10_000
    day = np.mean(np.sqrt(110.0 + 490.0 * cosines**0.25))
    expected = 0.75 * np.sqrt(np.pi) * np.sqrt(2.0 * boltzmann / mass) * 0.5 * (day + np.sqrt(110.0))
    # 20,000 speeds scatter by a third of their mean: 4 standard errors are 1.2 %.
    assert found == pytest.approx(expected, rel=0.012)


def test_grid_beyond_the_outer_radius_is_noted():
    spec = parse_run(FAST_ROTATOR.replace('top = "3 radii"', 'top = "4.5 radii"'), "top.toml")
    notes = preview(spec, build_scene(spec), 1).notes
    assert any("lies beyond the outer radius" in note for note in notes)
    whole = parse_run(FAST_ROTATOR, "top.toml")
    assert not any("outer radius" in note for note in preview(whole, build_scene(whole), 1).notes)


def test_check_says_how_rare_the_launches_are_that_emphasis_far_tells_apart():
    spec = parse_run(FAST_ROTATOR, "top.toml")
    even = preview(spec, build_scene(spec), 1)
    assert (even.emphasis, even.releases[0].rarest_launch) == ("even", None)
    spec = parse_run(FAST_ROTATOR.replace("batches = 10", 'batches = 10, emphasis = "far"'), "top.toml")
    far = preview(spec, build_scene(spec), 1)
    # lambda = GM m/(kTR) is 2.12: (1 + lambda) exp(-lambda) = 0.37 are faster than escape: the next power is 1/4.
    assert (far.emphasis, far.releases[0].rarest_launch) == ("far", 0.25)
