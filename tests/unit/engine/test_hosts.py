"""`body.host` of the run file: read, refused, resolved, checked, flown."""

import math

import pytest

from tracer.engine.kernel_world import kernel_world
from tracer.engine.preview import preview
from tracer.engine.runspec.load import parse_run
from tracer.engine.runspec.writing import run_file_text
from tracer.engine.scene import build_scene
from tracer.engine.single_flight import Launch, fly
from tracer.errors import InputError
from tracer.kernels.orbit import body_on_orbit
from tracer.observe.run_facts import run_facts

RUN = """
title = "host"
gas = { species = "Na" }
surface = { sticking = 1.0 }
grid = { altitude = { cells = 4 }, latitude_cells = 4, local_time_cells = 4 }
ensemble = { particles_per_batch = 5, batches = 2, replicates = 0 }
[[release]]
name = "vent"
rate = "1 s-1"
speed = { law = "single", speed = "1 km/s" }
"""
MOON = (
    RUN
    + """
[body]
name = "Moon"
host = { phase_angle = "180 deg" }
[sun]
true_anomaly = "0 deg"
"""
)
TINE = (
    RUN
    + """
[body]
name = "Tine"
radius = "160 km"
gm = "6.5 km3 s-2"
orbit = { semi_major_axis = "0.42 au", eccentricity = 0.18 }
host = { gm = "9500 km3 s-2", radius = "1800 km", distance = "14000 km", phase_angle = "90 deg" }
[sun]
true_anomaly = "0 deg"
"""
)
AT_EPOCH = ('body={ name = "Moon", host = {} }', 'sun={ epoch = "2025-03-14T06:59:00Z" }')
DAY = 86400.0
AU = 1.495978707e11


def refusal(text, *changes):
    with pytest.raises(InputError) as caught:
        build_scene(parse_run(text, "host.toml", changes))
    return str(caught.value).removeprefix("host.toml: ")


def scene_of(text, *changes):
    return build_scene(parse_run(text, "host.toml", changes))


def check(text, *changes):
    spec = parse_run(text, "host.toml", changes)
    return preview(spec, build_scene(spec), 1)


@pytest.mark.parametrize(
    ("text", "change", "message"),
    [
        (
            MOON,
            "body.host.phase_angel=3 deg",
            "body.host.phase_angel: unknown key; did you mean phase_angle?",
        ),
        (MOON, "body.host.phase_angle=3 km", "is not a unit of angle"),
        (MOON, "body.host.phase_angle=90", "body.host.phase_angle: 90 has no unit"),
        (MOON, "body.host.gm=-1 km3 s-2", 'body.host.gm: "-1 km3 s-2" is out of range'),
        (MOON, "body.host.period=0 d", 'body.host.period: "0 d" is out of range; must be other than 0 s'),
        (
            MOON,
            "body.host.rotation=free",
            'body.host.rotation: "free" is not allowed; must be "locked" or "turning"',
        ),
        (MOON, "body.host={}", "body.host.phase_angle: missing; write for example"),
        (MOON, "body.host=Earth", 'body.host: "Earth" is not allowed; must be a table'),
        (
            MOON,
            "body.host.distance=8000 km",
            'body.host.distance: "8000 km" must be above 8.1084e+06 m, where the spheres of moon and host touch',
        ),
        (
            MOON,
            "body.host.period=30 d",
            'body.host.period: "30 d" is not that of the distance: Kepler\'s third law gives 27.2846 d',
        ),
        (
            MOON,
            "body.rotation_period=3 d",
            'body.rotation_period: "3 d" stands beside host.rotation "locked"',
        ),
        (
            MOON,
            'body.orbit={ semi_major_axis = "4e5 km", eccentricity = 0.0 }',
            "body.orbit: is that of Moon about Earth, which body.host.distance says; must be left out",
        ),
        (MOON, "body.name=Mercury", "body.host.gm: missing; Mercury is no moon of the catalogue"),
        (
            TINE,
            'body.host={ gm = "9500 km3 s-2", radius = "1800 km", phase_angle = "0 deg" }',
            "body.host.distance: missing; Tine is no moon of the catalogue",
        ),
        (
            TINE,
            "body.host.rotation=turning",
            'body.rotation_period: missing; host.rotation is "turning"',
        ),
        (
            TINE,
            'sun={ epoch = "2025-03-14" }',
            'body.host.distance: "14000 km" stands beside sun.epoch, which tells it',
        ),
        (
            MOON,
            'sun={ epoch = "2025-03-14" }',
            'body.host.phase_angle: "180 deg" stands beside sun.epoch, which tells it; must be one of the two',
        ),
        (
            MOON,
            'surface={ sticking = 0.5, temperature = "hurley-2015", adsorbed = "desorbed", '
            'desorption = { energy = "0.3 eV", attempt_frequency = "1e13 s-1" } }',
            'body.host: stands beside surface.adsorbed "desorbed"',
        ),
    ],
)
def test_bad_host_gets_one_clear_message(text, change, message):
    assert message in refusal(text, change)


def test_a_host_without_gravity_needs_period_and_outer_radius():
    bare = 'body.host={ gm = "0 km3 s-2", radius = "1800 km", distance = "14000 km", phase_angle = "9 deg" }'
    nothing = "body.gm=0 km3 s-2"
    assert refusal(TINE, bare, nothing).startswith("body.host.period: missing; without gravity")
    period = "body.host.period=2 d"
    assert refusal(TINE, bare, nothing, period).startswith("domain.outer_radius: required beside a host")
    assert scene_of(TINE, bare, nothing, period, "domain.outer_radius=50 radii").integrated


def test_a_moon_beside_its_host_is_moved_by_sun_epoch_alone():
    assert refusal(MOON, *AT_EPOCH, 'sun={ epoch = "2025-03-14", motion = "moving" }').startswith(
        'sun.motion: "moving" beside an epoch is for planets: Moon swings about its host'
    )
    assert refusal(TINE, 'body.name="Mercury"', 'sun={ epoch = "2025-03-14" }', "body.host={}").startswith(
        "body.host.gm: missing"
    )


def test_a_host_is_written_out_and_read_again():
    for text in (MOON, TINE):
        spec = parse_run(text, "host.toml")
        assert parse_run(run_file_text(spec), "host.toml") == spec
        assert 'rotation = "locked"' in run_file_text(spec)


def test_a_moon_without_the_key_has_no_host():
    scene = scene_of(MOON, 'body={ name = "Moon" }')
    assert scene.moon is None
    assert any("body.host brings them in" in note for note in check(MOON, 'body={ name = "Moon" }').notes)
    assert check(MOON, 'body={ name = "Moon" }').host is None
    assert not any("brings them in" in note for note in check(MOON).notes)


def test_check_says_which_constants_of_a_host_are_not_the_catalogues():
    (note,) = (note for note in check(MOON, "body.host.gm=4e5 km3 s-2").notes if "gm" in note)
    assert "host.gm" in note
    assert not any("host.gm" in note or "host.distance" in note for note in check(MOON).notes)


def test_check_shows_the_host():
    figures = check(MOON)
    host = figures.host
    assert (host.host, host.eclipse, host.sun_past_host) == ("Earth", "none", 1.0)
    assert host.host_distance == 384400e3
    assert host.host_period == pytest.approx(27.32166 * DAY)
    assert host.phase_angle == 180.0
    assert figures.propagator.startswith("adaptive integration")
    # New moon stands nearer to the Sun, by its distance from the Earth at its perihelion, and runs slower about it.
    perihelion = 1.000001 * (1.0 - 0.0167) * AU
    assert figures.sun.distance == pytest.approx(perihelion - 384400e3, rel=1e-12)
    rate = 2.0 * math.pi / (27.32166 * DAY)
    about_sun = math.sqrt(1.32712440018e20 / perihelion * 1.0167)
    assert host.transverse_velocity == pytest.approx(about_sun - rate * 384400e3, rel=1e-6)
    assert figures.sun.radial_velocity == pytest.approx(0.0, abs=1e-9)
    # The last quarter falls towards the Sun with nearly all of its 1 km/s.
    assert check(MOON, "body.host.phase_angle=90 deg").sun.radial_velocity == pytest.approx(-945.0, abs=5.0)
    # a (m/3M)^(1/3): 61,524 km (calc).
    assert figures.outer_radius == pytest.approx(384400e3 * (4902.8 / (3.0 * 398600.4418)) ** (1.0 / 3.0))
    assert figures.outer_radius_is_hill_radius


@pytest.mark.parametrize(
    ("angle", "eclipse"),
    [(0.0, "total"), (0.6, "partial"), (1.0, "penumbral"), (1.4, "penumbral"), (1.6, "none")],
)
def test_check_shows_an_eclipse(angle, eclipse):
    """Umbra and penumbra of the Earth reach 4,590 and 8,160 km from the axis where the Moon is (own geometry)."""
    host = check(MOON, f"body.host.phase_angle={angle} deg").host
    assert host.eclipse == eclipse
    assert (host.sun_past_host == 0.0) == (angle < 0.68)
    assert (host.sun_past_host == 1.0) == (angle > 1.21)


def test_check_shows_an_epoch():
    figures = check(MOON, *AT_EPOCH)
    # The total eclipse of 14 March 2025, greatest about 06:59 UTC (memory), from 366,000 to 402,000 km that month.
    assert figures.host.eclipse == "total"
    assert abs((figures.host.phase_angle + 180.0) % 360.0 - 180.0) < 0.5
    assert 395e6 < figures.host.host_distance < 405e6
    assert 0.1 < figures.host.host_latitude < 0.6 or -0.6 < figures.host.host_latitude < -0.1
    # Near apogee the Moon goes slower than in the mean.
    assert 28.0 * DAY < figures.host.host_period < 32.0 * DAY
    assert not any("circle in the plane" in note for note in figures.notes)


def test_locked_ground_does_not_turn_and_turning_ground_does():
    assert scene_of(TINE).ground_spin == pytest.approx(0.0, abs=1e-20)
    rate = 2.0 * math.pi / scene_of(TINE).body.rotation_period
    # Kepler's third law: 2 pi sqrt(14000^3 / 9506.5) s.
    assert 2.0 * math.pi / rate == pytest.approx(2.0 * math.pi * math.sqrt(14000.0**3 / 9506.5), rel=1e-12)
    turning = scene_of(TINE, "body.host.rotation=turning", "body.rotation_period=5 h")
    assert turning.ground_spin == pytest.approx(2.0 * math.pi / 18000.0 - rate, rel=1e-12)
    # Where the moon moves, the frame keeps to the Sun, and locked ground turns under it.
    moving = scene_of(TINE, "sun.motion=moving")
    assert moving.ground_spin == pytest.approx(rate - moving.moon.station.orbital_rate, rel=1e-12)


@pytest.mark.parametrize("angle", [0.0, 50.0, 184.0])
def test_velocities_are_seen_along_axes_that_do_not_turn_with_the_moon(angle):
    """At the stated position the frame of a moon that moves turns as the Sun's direction does, seen from the moon."""
    scene = scene_of(MOON, "sun.motion=moving", f"body.host.phase_angle={angle} deg")
    world = kernel_world(scene)
    seen = body_on_orbit(world.light.conditions.sky.forces, 0.0)
    assert world.images.velocities.turning == pytest.approx(seen.turning, rel=1e-9)
    # Which is not the host's rate about the Sun, by the Moon's 1 km/s over the Earth's 30.
    slower = scene.moon.host_station.orbital_rate
    assert (seen.turning > slower * 1.02) if angle < 90.0 else (seen.turning < slower * 0.98)


def test_a_retrograde_moon_goes_the_other_way():
    scene = scene_of(TINE, "body.host.period=-1.23 d")
    assert scene.frame_rate < 0.0
    assert scene.moon.station.radial_velocity > 0.0 > scene_of(TINE).moon.station.radial_velocity


def test_without_a_sun_host_and_moon_turn_alone():
    scene = scene_of(TINE.partition("[sun]")[0])
    assert scene.integrated
    assert scene.sun is None
    assert scene.frame_rate > 0.0
    launch = Launch(latitude=0.0, local_time=18.0, speed=2000.0, zenith_angle=0.0, azimuth=0.0)
    flown = fly(scene, launch)
    assert flown.summary.fate == "escaped"


def test_a_flight_may_end_on_the_host():
    """Straight at the host, 18 h, at a speed that leaves it no time to miss; the last row lies on its surface."""
    scene = scene_of(TINE, "domain.outer_radius=300 radii")
    launch = Launch(latitude=0.0, local_time=18.0, speed=60000.0, zenith_angle=0.0, azimuth=0.0)
    flown = fly(scene, launch)
    assert flown.summary.fate == "other_loss"
    x, y, z = flown.path[-1, 3:6]
    assert math.hypot(x, y - 14000e3, z) == pytest.approx(1800e3, rel=1e-9)
    # On its way from the umbra's side the Sun is seen.
    assert (flown.path[:, 2] > 0.0).all()


def test_what_an_observer_learns_of_the_outer_radius():
    moon, tine = (run_facts(run_file_text(parse_run(text, "host.toml")), 1.0, None) for text in (MOON, TINE))
    assert moon.outer_radius == pytest.approx(scene_of(MOON).outer_radius)
    assert tine.outer_radius == pytest.approx(scene_of(TINE).outer_radius)
    assert tine.orbit.semi_major_axis == pytest.approx(0.42 * AU)
