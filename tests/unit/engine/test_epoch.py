"""`sun.epoch` of the run file: read, refused, resolved, written."""

from datetime import UTC, datetime

import pytest

from tracer.engine.preview import preview
from tracer.engine.runspec.load import parse_run
from tracer.engine.runspec.writing import run_file_text
from tracer.engine.scene import build_scene
from tracer.engine.tracing import run
from tracer.errors import InputError

RUN = """
title = "epoch"
body = { name = "Mercury" }
gas = { species = "Na" }
surface = { sticking = 1.0 }
grid = { altitude = { cells = 4 }, latitude_cells = 4, local_time_cells = 4 }
ensemble = { particles_per_batch = 5, batches = 2, replicates = 0 }
sun = { epoch = "2001-05-26T00:00:00Z" }
[[release]]
name = "vent"
rate = "1 s-1"
speed = { law = "single", speed = "1 km/s" }
"""


def spec(*changes):
    return parse_run(RUN, "epoch.toml", changes)


def refusal(*changes) -> str:
    with pytest.raises(InputError) as caught:
        build_scene(spec(*changes))
    return str(caught.value).removeprefix("epoch.toml: ")


@pytest.mark.parametrize(
    "given",
    [
        '"2001-05-26T00:00:00Z"',
        '"2001-05-26"',
        '"2001-05-26 00:00"',
        '"2001-05-26T02:00:00+02:00"',
        "2001-05-26T00:00:00Z",
        "2001-05-26T00:00:00",
        "2001-05-26",
    ],
)
def test_a_moment_is_text_or_tomls_own_and_utc_without_an_offset(given):
    read = parse_run(RUN.replace('"2001-05-26T00:00:00Z"', given), "epoch.toml")
    assert read.sun.epoch == datetime(2001, 5, 26, tzinfo=UTC)
    assert 'epoch = "2001-05-26T00:00:00Z"' in run_file_text(read)
    assert parse_run(run_file_text(read), "epoch.toml").sun == read.sun


def test_check_and_product_say_where_the_body_stood():
    given = spec()
    scene = build_scene(given)
    figures = preview(given, scene, 1)
    assert figures.sun.epoch == "2001-05-26T00:00:00Z"
    # Leblanc & Johnson 2003, Icarus 164, 261: 125 degrees.
    assert figures.sun.true_anomaly == pytest.approx(125.0, abs=0.1)
    product = run(given, workers=1)
    assert product.attrs["true_anomaly"] == figures.sun.true_anomaly
    assert product.attrs["sun_distance"] == scene.sun.station.distance
    assert 'epoch = "2001-05-26T00:00:00Z"' in product.attrs["run_file"]


def test_the_moon_stands_at_its_own_distance():
    given = spec("body.name=Moon")
    notes = preview(given, build_scene(given), 1).notes
    assert any("stands at its own distance from the Sun" in note for note in notes)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        (
            ["body.name=Ceres"],
            'sun.epoch: "2001-05-26T00:00:00Z" the ephemeris knows Mercury and Moon of the catalogue, not Ceres; '
            "give sun.true_anomaly or sun.distance",
        ),
        (
            ['body.orbit={ semi_major_axis = "0.4 au", eccentricity = 0.1 }'],
            'sun.epoch: "2001-05-26T00:00:00Z" is for Mercury on its own orbit; leave out body.orbit, or give '
            "sun.true_anomaly",
        ),
    ],
)
def test_bodies_without_an_ephemeris_are_refused(changes, message):
    assert refusal(*changes) == message


@pytest.mark.parametrize(
    ("given", "message"),
    [
        ("sun.epoch=soon", 'sun.epoch: "soon" is no moment; write for example "2001-05-26T00:00:00Z"'),
        ("sun.epoch=2001-13-01", "no moment"),
        ("sun.epoch=5", "no moment"),
        ("sun.epoch=1899-01-01", "is out of range; must be from 1960-01-01 to 2100-01-01"),
        ("sun.epoch=0001-01-01T00:00:00+14:00", "is out of range; must be from 1960-01-01 to 2100-01-01"),
        ("sun.epoch=9999-12-31T23:00:00-14:00", "is out of range; must be from 1960-01-01 to 2100-01-01"),
        ("sun.true_anomaly=5 deg", 'sun.epoch: "2001-05-26T00:00:00Z" stands beside true_anomaly "5 deg"'),
        ("sun.distance=0.4 au", 'sun.distance: "0.4 au" stands beside epoch "2001-05-26T00:00:00Z"'),
        ("sun.radial_velocity=4 km/s", "with epoch it follows from the orbit"),
    ],
)
def test_what_is_no_moment_is_refused(given, message):
    with pytest.raises(InputError, match=r"epoch\.toml: sun") as caught:
        spec(given)
    assert message in str(caught.value)
