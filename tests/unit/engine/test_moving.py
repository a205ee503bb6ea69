"""`sun.motion = "moving"` and `rate_scaling` of the run file: read, refused, checked, flown."""

import numpy as np
import pytest

from tracer.engine.preview import preview
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene
from tracer.engine.single_flight import Launch, fly
from tracer.engine.tasks import BatchRange
from tracer.engine.tracing import run
from tracer.errors import InputError
from tracer.product.merging import merged_product

RUN = """
title = "moving"
body = { name = "Mercury" }
gas = { species = "Na" }
surface = { temperature = { law = "uniform", value = "500 K" }, sticking = 0.5 }
domain = { outer_radius = "10 radii", age_limit = "2 d" }
grid = { altitude = { cells = 4 }, latitude_cells = 4, local_time_cells = 4 }
ensemble = { particles_per_batch = 40, batches = 4, replicates = 2 }
sun = { true_anomaly = "60 deg", motion = "moving" }
[[release]]
name = "vapour"
rate = "1e24 s-1"
speed = { law = "maxwell-flux", temperature = "4000 K" }
"""


def refusal(text: str, *changes: str) -> str:
    with pytest.raises(InputError) as caught:
        build_scene(parse_run(text, "moving.toml", changes))
    return str(caught.value).removeprefix("moving.toml: ")


def test_a_distance_alone_is_no_orbit_to_move_on():
    text = RUN.replace('true_anomaly = "60 deg"', 'distance = "0.35 au"')
    assert refusal(text) == (
        'sun.motion: "moving" stands beside distance; it needs a place on the orbit: true_anomaly or epoch'
    )


def test_a_body_without_an_orbit_cannot_move():
    text = RUN.replace('{ name = "Mercury" }', '{ name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2" }')
    assert refusal(text).startswith('sun.true_anomaly: "60 deg" needs an orbit')


def test_a_moon_at_an_epoch_swings_about_its_host():
    text = RUN.replace("Mercury", "Moon").replace('true_anomaly = "60 deg"', 'epoch = "2001-05-26"')
    assert "sun.motion" in refusal(text)
    assert build_scene(parse_run(text.replace("moving", "stationary"), "moving.toml")).sun.orbit is None


def test_a_rate_follows_only_a_distance_that_changes():
    text = RUN.replace('"1e24 s-1"', '"1e24 s-1"\nrate_scaling = "inverse-square"')
    assert build_scene(parse_run(text, "moving.toml")).releases[0].follows_distance
    wrong = refusal(text, 'sun.motion="stationary"')
    assert wrong.startswith('release[1].rate_scaling: "inverse-square" needs sun.motion = "moving"')
    assert "release[1].rate_scaling" in refusal(text.replace('"inverse-square"', '"inverse"'))


def test_words_of_motion_are_two():
    assert '"stationary" or "moving"' in refusal(RUN, 'sun.motion="fast"')


def test_an_epoch_moves_a_planet_on_the_orbit_that_osculates_its_motion():
    text = RUN.replace('true_anomaly = "60 deg"', 'epoch = "2001-05-26"')
    orbit = build_scene(parse_run(text, "moving.toml")).sun.orbit
    # Mercury: Standish & Williams, Approximate positions of the planets (memory): a 0.387099 au, e 0.205636.
    assert orbit.semi_major_axis / 1.495978707e11 == pytest.approx(0.387099, rel=1e-4)
    assert orbit.eccentricity == pytest.approx(0.205636, rel=1e-3)


def test_check_says_how_the_body_moves():
    spec = parse_run(RUN, "moving.toml")
    moving = preview(spec, build_scene(spec), 1).sun
    assert moving.motion == "moving"
    # One degree of mean anomaly: Mercury's 87.97 days over 360.
    assert moving.event_window == pytest.approx(87.97 * 86400.0 / 360.0, rel=1e-3)
    spec = parse_run(RUN, "moving.toml", ['domain.age_limit="1 h"'])
    assert build_scene(spec).event_window == pytest.approx(3600.0)
    spec = parse_run(RUN, "moving.toml", ['sun.motion="stationary"'])
    still = preview(spec, build_scene(spec), 1).sun
    assert still.motion == "stationary"
    assert still.event_window is None


def test_a_body_that_moves_needs_the_integrator_even_without_tide_and_light():
    changes = ["sun.tide=false", 'gas.radiation_acceleration="none"', 'gas.photoionization_rate="0 s-1"']
    dark = RUN.replace('"Na"', '"He"').replace(', motion = "moving"', "")
    assert not build_scene(parse_run(dark, "moving.toml", changes)).integrated
    assert build_scene(parse_run(dark, "moving.toml", [*changes, 'sun.motion="moving"'])).integrated


def test_product_is_the_same_for_any_number_of_workers():
    spec = parse_run(RUN, "moving.toml")
    one, two = run(spec, workers=1), run(spec, workers=2)
    assert one.attrs["data_checksum"] == two.attrs["data_checksum"]
    released = float((one.release_flux * one.cell_area).sum())
    assert released == pytest.approx(1e24, rel=1e-12)
    assert float(one.ledger.sum()) == pytest.approx(1e24, rel=1e-9)


def test_shares_of_a_run_merge_to_what_the_whole_run_tells():
    spec = parse_run(RUN, "moving.toml", ['domain.age_limit="1 h"'])
    whole = run(spec, workers=1)
    parts = [run(spec, workers=1, batches=BatchRange(*ends)) for ends in ((0, 1), (1, 4))]
    merged = merged_product([(f"part {i}", part) for i, part in enumerate(parts)])
    assert 0.0 < whole.attrs["share_older_than_age_limit"][0] < 0.5
    for key in ("share_older_than_age_limit", "event_window"):
        np.testing.assert_allclose(merged.attrs[key], whole.attrs[key], rtol=1e-9)
    np.testing.assert_allclose(merged.number_density, whole.number_density, rtol=1e-9)


def test_stationary_products_say_so_and_know_no_window():
    ds = run(parse_run(RUN, "moving.toml", ['sun.motion="stationary"']), workers=1)
    assert ds.attrs["motion"] == "stationary"
    assert "event_window" not in ds.attrs


def test_a_flight_starts_at_the_stated_position():
    """The first hour of a flight is that of a body that stands still; days later the ways part."""
    launch = Launch(latitude=20.0, local_time=14.0, speed=4300.0, zenith_angle=20.0, azimuth=70.0)
    changes = ['domain.outer_radius="1000 radii"']
    ways = {}
    for motion in ("moving", "stationary"):
        spec = parse_run(RUN, "moving.toml", [*changes, f'sun.motion="{motion}"'])
        ways[motion] = fly(build_scene(spec), launch).path
    for column in (3, 4, 5):
        at_first = [np.interp(1000.0, way[:, 0], way[:, column]) for way in ways.values()]
        assert at_first[0] == pytest.approx(at_first[1], abs=1e-3 * 2.44e6)
    assert abs(ways["moving"][-1, 0] / ways["stationary"][-1, 0] - 1.0) > 1e-3


def test_atoms_do_not_rest_on_ground_that_turns_unevenly():
    text = RUN.replace(
        "sticking = 0.5 }",
        'sticking = 0.5, adsorbed = "desorbed", desorption = { energy = "1.85 eV", attempt_frequency = "1e13 s-1" } }',
    )
    assert refusal(text).startswith('sun.motion: "moving" stands beside surface.adsorbed "desorbed"')
    assert build_scene(parse_run(text, "moving.toml", ['sun.motion="stationary"'])).sun.orbit is None
