"""The Sun's part of a scene, what `check` says of it, and that runs in sunlight can be repeated to the last bit."""

import random
from pathlib import Path

import numpy as np
import pytest

import tracer.engine.batches as batches
from tracer.engine.batches import Task, make_work, trace_batch
from tracer.engine.preview import ARCS, INTEGRATOR, preview
from tracer.engine.runspec.load import load_run, parse_run
from tracer.engine.scene import build_scene
from tracer.engine.tracing import run
from tracer.errors import InputError

RUN = """
title = "sunlight"
body = { name = "Mercury" }
gas = { species = "Na" }
surface = { sticking = 1.0 }
[[release]]
name = "vent"
rate = "1 s-1"
speed = { law = "single", speed = "1 km/s" }
"""
SUN = "sun.true_anomaly=59 deg"
BALL = 'body={ name = "Ball", radius = "1000 km", gm = "3000 km3 s-2" }'
NEAR = "domain.outer_radius=20 radii"
AU = 1.495978707e11


def spec(*changes, folder=Path("nowhere")):
    return parse_run(RUN, str(folder / "sodium.toml"), changes)


def scene(*changes):
    return build_scene(spec(*changes))


def figures(*changes):
    given = spec(*changes)
    return preview(given, build_scene(given), 1)


def refusal(*changes, folder=Path("nowhere")):
    with pytest.raises(InputError) as caught:
        build_scene(spec(*changes, folder=folder))
    return str(caught.value).removeprefix(f"{folder / 'sodium.toml'}: ")


@pytest.mark.parametrize("true_anomaly", [0.0, 77.0, 180.0, 295.0])
def test_true_anomaly_and_the_distance_there_are_the_same_station(true_anomaly):
    on_orbit = scene(f"sun.true_anomaly={true_anomaly} deg").sun.station
    at_distance = scene(
        f"sun.distance={on_orbit.distance!r} m", f"sun.radial_velocity={on_orbit.radial_velocity!r} m/s"
    ).sun.station
    assert at_distance == pytest.approx(on_orbit, rel=1e-12, abs=1e-9)


def test_body_without_an_orbit_turns_at_the_circular_rate():
    station = scene("sun.distance=0.5 au", BALL, NEAR).sun.station
    # GM of the Sun as in IAU 2015 Resolution B3.
    expected = (1.3271244e20 / (0.5 * AU) ** 3) ** 0.5
    assert station == pytest.approx((0.5 * AU, 0.0, expected), rel=1e-6)


def test_moon_stands_where_its_host_does():
    # Earth at its perihelion, 1.000001 au (1 - 0.0167).
    station = scene("sun.true_anomaly=0 deg", "body.name=Moon").sun.station
    assert station.distance == pytest.approx(1.000001 * (1.0 - 0.0167) * AU, rel=1e-12)
    notes = figures("sun.true_anomaly=0 deg", "body.name=Moon").notes
    assert (
        "Moon has the distance and velocity of Earth from the Sun; its own motion about Earth, and the gravity and "
        "shadow of Earth, are left out; body.host brings them in"
    ) in notes


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        (
            ["sun.distance=0.2 au"],
            'sun.distance: "0.2 au" the distance 2.99196e+10 m lies outside the orbit, which runs from 4.60012e+10 m '
            "to 6.98169e+10 m from the Sun",
        ),
        (
            [SUN, BALL, NEAR],
            'sun.true_anomaly: "59 deg" needs an orbit; give body.orbit, or sun.distance',
        ),
        (
            [SUN, "gas.species=He", "gas.radiation_acceleration=lines"],
            'gas.radiation_acceleration: "lines" no line of He with known g is in the catalogue; give its '
            '[[gas.line]], a push such as "0.05 m s-2" at 1 au, or "none"',
        ),
    ],
)
def test_what_the_scene_refuses(changes, message):
    assert refusal(*changes) == message


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (None, "cannot be read: No such file or directory"),
        ("v,g\n1\n2\n", "line 2: '1' is not two numbers: radial velocity in km/s, g in 1/s"),
        ("0,1\n", "has 1 rows of numbers; at least 2 are needed"),
        ("0,1\n1,0.5\n1,0.2\n", "line 3: 1 does not rise above 1"),
        ("0,1\n-5,0.5\n", "line 2: -5 does not rise above 0"),
        ("0,1\n1,-2\n", "velocities must be finite, and g finite and not negative"),
        ("0,1\n1,nan\n", "line 2: '1,nan' is not finite"),
        ("0,1\n0.0005,1\n", "velocities must rise from row to row by more than 1 m/s"),
    ],
)
def test_file_of_g_that_cannot_be_used(tmp_path, content, message):
    if content is not None:
        (tmp_path / "g.csv").write_text(content, encoding="utf-8")
    line = 'gas.line=[{ name = "mine", wavelength = "500 nm", g = { file = "g.csv" } }]'
    assert refusal(SUN, line, folder=tmp_path) == f'gas.line[1].g.file: "g.csv" {message}'


def test_file_of_g_is_read_in_its_units(tmp_path):
    (tmp_path / "g.csv").write_text("# invented\nv,g\n-2,0.5\n3,1.5\n", encoding="utf-8")
    line = 'gas.line=[{ name = "mine", wavelength = "500 nm", g = { file = "g.csv" } }]'
    table = build_scene(spec(SUN, line, folder=tmp_path)).sun.lines[-1]
    assert (table.name, table.first_velocity, table.velocity_step) == ("mine", -2000.0, 5000.0)
    assert table.g.tolist() == [0.5, 1.5]


def test_line_named_like_one_of_the_catalogue_replaces_it_and_check_says_so():
    line = 'gas.line=[{ name = "na_d2", wavelength = "589 nm", g = "1.5 s-1" }]'
    lines = {table.name: table for table in scene(SUN, line).sun.lines}
    assert set(lines) == {"na_d1", "na_d2"}
    assert lines["na_d2"].g.tolist() == [1.5]
    assert "lines na_d2 of the run file replace the catalogue's" in figures(SUN, line).notes
    assert figures(SUN).notes == ()


def test_lines_without_g_are_named_and_do_nothing_until_their_g_is_given():
    magnesium = [SUN, "gas.species=Mg"]
    dark = figures(*magnesium)
    assert dark.sun.lines_without_g == ("mg_2852",)
    assert dark.sun.radiation_acceleration == 0.0
    assert (
        "lines mg_2852 have no known g: they neither push nor shine; a [[gas.line]] can give it" in dark.notes
    )
    given = figures(*magnesium, 'gas.line=[{ name = "mg_2852", wavelength = "285.3 nm", g = "0.5 s-1" }]')
    assert (given.sun.lines, given.sun.lines_without_g) == (("mg_2852",), ())
    # 0.5 s-1 times h/(m lambda) at the distance of true anomaly 59 deg.
    push = 0.5 * 6.62607015e-34 / (24.305 * 1.66053906892e-27 * 285.3e-9) * (AU / given.sun.distance) ** 2
    assert given.sun.radiation_acceleration == pytest.approx(push, rel=1e-6)


@pytest.mark.parametrize(("push", "acceleration"), [("none", 0.0), ("0.05 m s-2", 0.05 * 4.0)])
def test_push_given_by_hand_is_that_at_1_au_and_lines_still_shine(push, acceleration):
    sun = figures("sun.distance=0.5 au", BALL, NEAR, f"gas.radiation_acceleration={push}").sun
    assert sun.radiation_acceleration == pytest.approx(acceleration, rel=1e-12)
    assert sun.lines == ("na_d2", "na_d1")


def test_push_on_sodium_at_mercury_is_half_of_the_surface_gravity():
    sun = figures(SUN).sun
    # Potter & Killen 2008, Icarus 194, 1: at most 54 % of surface gravity; 53 % at 59 deg is computed for this project.
    assert sun.radiation_acceleration_over_gravity == pytest.approx(0.53, abs=0.01)
    assert sun.radiation_acceleration_over_gravity < 0.54
    # At perihelion, nearer to the Sun but not receding, atoms see the dark core of the solar line: 28.6 cm s-2.
    assert figures("sun.true_anomaly=0 deg").sun.radiation_acceleration == pytest.approx(0.286, rel=0.02)


def test_check_tells_true_anomaly_distance_and_photo_lifetime():
    sun = figures(SUN).sun
    a, e = 0.387098 * AU, 0.205630
    distance = a * (1.0 - e * e) / (1.0 + e * np.cos(np.radians(59.0)))
    assert sun.true_anomaly == 59.0
    assert sun.distance == pytest.approx(distance, rel=1e-12)
    # Huebner, Keady & Lyon 1992, Astrophys. Space Sci. 195, 1 (memory): 5.9e-6 s-1 at 1 au, quiet Sun.
    assert sun.photo_lifetime == pytest.approx((distance / AU) ** 2 / 5.9e-6, rel=1e-6)
    assert figures("sun.distance=0.4 au").sun.true_anomaly is None


@pytest.mark.parametrize(
    ("species", "note"),
    [
        ("OH", "ionisation and dissociation of OH are not told apart: all counts as other_loss"),
        (
            "O2",
            "the catalogue has no photo-rate of O2: sunlight destroys none; gas.photoionization_rate can give one",
        ),
    ],
)
def test_check_says_what_is_not_known_of_a_gas(species, note):
    assert note in figures(SUN, f"gas.species={species}").notes
    assert figures(SUN, f"gas.species={species}", "gas.photoionization_rate=1e-6 s-1").notes == ()


GENTLE = ["sun.distance=0.4 au", "sun.tide=false", "gas.species=O2"]


@pytest.mark.parametrize(
    ("changes", "propagator"),
    [
        ([], ARCS),
        (GENTLE, ARCS),
        ([*GENTLE, 'gas.loss=[{ name = "any", rate = "1e-5 s-1" }]'], ARCS),
        ([*GENTLE, "sun.tide=true"], INTEGRATOR),
        ([*GENTLE, "gas.photoionization_rate=1e-6 s-1"], INTEGRATOR),
        ([*GENTLE, "gas.radiation_acceleration=0.01 m s-2"], INTEGRATOR),
        ([*GENTLE, 'gas.loss=[{ name = "any", rate = "1e-5 s-1", where = "sunlight" }]'], INTEGRATOR),
        ([*GENTLE, 'gas.line=[{ name = "mine", wavelength = "500 nm", g = "1 s-1" }]'], INTEGRATOR),
        (["sun.distance=0.4 au", "sun.tide=false"], INTEGRATOR),
    ],
)
def test_arcs_serve_where_nothing_but_the_frames_turning_comes_from_the_sun(changes, propagator):
    assert figures(*changes).propagator == propagator


FAST = """
title = "fast atoms"
[body]
name = "Pebble"
radius = "100 km"
gm = "0 km3 s-2"
[sun]
distance = "0.5 au"
tide = false
shadow = "none"
[gas]
species = "O2"
radiation_acceleration = "none"
[[gas.line]]
name = "mine"
wavelength = "500 nm"
g = { file = "g.csv" }
[[release]]
name = "jet"
rate = "1 s-1"
speed = { law = "single", speed = "60 km/s" }
direction = { law = "normal" }
[surface]
sticking = 1.0
[domain]
outer_radius = "10 radii"
[grid]
altitude = { cells = 1 }
latitude_cells = 1
local_time_cells = 1
[ensemble]
particles_per_batch = 2_000
batches = 5
replicates = 0
"""


@pytest.mark.parametrize(
    ("speed", "share"), [(60.0, 1.0 - 20.0 / 60.0), (30.0, 1.0 - 20.0 / 30.0), (19.0, 0.0)]
)
def test_share_of_time_beyond_the_table_of_g_is_reported(tmp_path, speed, share):
    (tmp_path / "g.csv").write_text("-20,1\n20,2\n", encoding="utf-8")
    given = parse_run(FAST, str(tmp_path / "fast.toml"), [f"release[1].speed.speed={speed} km/s"])
    found = run(given, workers=1).attrs["share_beyond_line_tables"]
    # Atoms fly straight away from the centre in all directions: their velocity from the Sun is even in -speed..speed.
    # 10,000 atoms: four standard errors, false alarm 6e-5.
    assert found == pytest.approx([share], abs=4.0 * np.sqrt(share * (1.0 - share) / 1e4))


@pytest.fixture(scope="module")
def small_light_spec(small_light_run_file):
    return load_run(small_light_run_file)


def test_small_light_product_shines_and_is_ionised_in_part(small_light_product):
    assert small_light_product.line_name.values.tolist() == ["na_d2", "na_d1", "invented"]
    assert small_light_product.attrs["integration_steps"] > 10_000
    for name in ("emission_rate", "brightness_tail_from_north", "ionization_rate"):
        assert float(small_light_product[name].sum()) > 0.0


@pytest.mark.parametrize("workers", [2, 3])
def test_product_in_sunlight_does_not_depend_on_the_workers(small_light_spec, small_light_product, workers):
    product = run(small_light_spec, workers=workers)
    assert product.attrs["data_checksum"] == small_light_product.attrs["data_checksum"]
    assert product.attrs["integration_steps"] == small_light_product.attrs["integration_steps"]


@pytest.mark.parametrize("order", [1, 2])
def test_product_in_sunlight_does_not_depend_on_the_order_of_batches(
    small_light_spec, small_light_product, order
):
    def shuffled(work, tasks, workers, tell, tick):
        for task in random.Random(order).sample(tasks, len(tasks)):
            yield task, trace_batch(work, task, tell, lambda: False)

    product = run(small_light_spec, executor=shuffled)
    assert product.attrs["data_checksum"] == small_light_product.attrs["data_checksum"]


@pytest.mark.parametrize("budget", [1, 3, 50])
def test_batch_in_sunlight_does_not_depend_on_its_slices(small_light_spec, monkeypatch, budget):
    work = make_work(build_scene(small_light_spec), 3, 100)
    told = []

    def trace():
        told.clear()
        return trace_batch(
            work, Task(0, 0), lambda atoms, flights: told.append((atoms, flights)), lambda: False
        )

    whole = trace()
    monkeypatch.setattr(batches, "next_budget", lambda _budget, _spent: budget)
    monkeypatch.setattr(batches, "FIRST_SLICE_FLIGHTS", budget)
    sliced = trace()
    assert np.array_equal(whole.buffer, sliced.buffer)
    assert whole.steps == sliced.steps
    assert sum(flights for _, flights in told) == whole.flights
    # Short slices do stop between an atom's bounces: it counts in part.
    assert any(0.0 < atoms < 0.5 for atoms, _ in told) or budget == 50


@pytest.mark.parametrize(
    ("changes", "key"),
    [
        (["sun.distance=0.004 au"], "sun.distance"),
        (
            ['body.orbit={ semi_major_axis = "0.01 au", eccentricity = 0.6 }', "sun.true_anomaly=0 deg"],
            "body.orbit",
        ),
        (
            [
                'body.orbit={ semi_major_axis = "0.01 au", eccentricity = 0.6 }',
                "sun.true_anomaly=110 deg",
                "sun.motion=moving",
            ],
            "body.orbit",
        ),
    ],
)
def test_a_body_inside_the_sun_is_refused(changes, key):
    if key == "sun.distance":
        changes = ['body={ name = "Ball", radius = "1000 km", gm = "3000 km3 s-2" }', NEAR, *changes]
    message = refusal(*changes)
    assert message.startswith(f"{key}: brings the body to ")
    assert "inside the Sun; must stay above 0.0046" in message
