"""Paths from SPICE kernels that the test writes itself, against the same positions from a table."""

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from tracer.errors import InputError
from tracer.observe.plan import plan_observation
from tracer.observe.planspec.plan import parse_plan
from tracer.observe.spice_path import _refuse_turning_normals, spice_states
from tracer.tally.axes import make_grid

spiceypy = pytest.importorskip("spiceypy", reason="spiceypy, the extra spice, is not installed")

RADIUS = 1.8e6
GRID = make_grid(RADIUS, 5e4, 9e6, 6, 4, 6)
LANTERN, HARROW, SUN = -999001, 2999001, 10
DISTANCE, YEAR = 6e7, 8.6e6
"""Radius [km] and period [s] of Harrow's orbit in this test, a circle."""
TILT = Rotation.from_euler("xyz", [25.0, -10.0, 40.0], degrees=True)
"""From axes in which that orbit lies in the plane of x and y to J2000."""
START, STEP, COUNT = "2031-06-01T00:00:00", 300.0, 13

LEAPSECONDS = """KPL/LSK
\\begindata
DELTET/DELTA_T_A = 32.184
DELTET/K = 1.657D-3
DELTET/EB = 1.671D-2
DELTET/M = ( 6.239996D0 1.99096871D-7 )
DELTET/DELTA_AT = ( 36, @2015-JUL-1 37, @2017-JAN-1 )
\\begintext
"""
FRAMES = f"""KPL/FK
\\begindata
NAIF_BODY_NAME += ( 'LANTERN', 'HARROW' )
NAIF_BODY_CODE += ( {LANTERN}, {HARROW} )
FRAME_LANTERN_AXES = 1999001
FRAME_1999001_NAME = 'LANTERN_AXES'
FRAME_1999001_CLASS = 4
FRAME_1999001_CLASS_ID = 1999001
FRAME_1999001_CENTER = {HARROW}
TKFRAME_1999001_RELATIVE = 'J2000'
TKFRAME_1999001_SPEC = 'MATRIX'
TKFRAME_1999001_MATRIX = ( 0 1 0  0 0 1  1 0 0 )
\\begintext
"""
PLAN = """
title = "Kernels"
[observer]
{observer}
[pointing]
law = "direction"
direction = {direction}
[spectrometer]
collecting_area = "10 cm2"
field_of_view = {{ width = "0.2 deg", height = "0.1 deg" }}
exposure = "10 s"
sun_keep_out = "10 deg"
[[spectrometer.line]]
name = "na_d2"
throughput = 0.1
"""
KERNELS = """law = "spice"
kernels = ["leapseconds.tls", "frames.tf", "lantern.bsp"]
observer = "LANTERN"
target = "HARROW"
frame = "LANTERN_AXES"
start = "2031-06-01T00:00:00"
stop = "2031-06-01T01:00:00"
step = "5 min"
"""


def harrow(seconds: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return position [km] and velocity of Harrow from the Sun in J2000."""
    angle, rate = 2.0 * np.pi * seconds / YEAR + 1.0, 2.0 * np.pi / YEAR
    place = DISTANCE * np.stack([np.cos(angle), np.sin(angle), 0.0 * angle], axis=1)
    speed = rate * DISTANCE * np.stack([-np.sin(angle), np.cos(angle), 0.0 * angle], axis=1)
    return TILT.apply(place), TILT.apply(speed)


def lantern(seconds: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return position [km] and velocity of Lantern from Harrow in J2000."""
    rate = 2.0 * np.pi / 2.2e4
    angle = rate * seconds
    circle = Rotation.from_euler("xz", [80.0, 30.0], degrees=True)
    place = 4000.0 * np.stack([np.cos(angle), np.sin(angle), 0.0 * angle], axis=1)
    speed = 4000.0 * rate * np.stack([-np.sin(angle), np.cos(angle), 0.0 * angle], axis=1)
    return circle.apply(place), circle.apply(speed)


@pytest.fixture
def folder(tmp_path):
    """Return a folder with a leapseconds kernel, a frame kernel and an SPK of both orbits."""
    (tmp_path / "leapseconds.tls").write_text(LEAPSECONDS, encoding="ascii")
    (tmp_path / "frames.tf").write_text(FRAMES, encoding="ascii")
    spiceypy.furnsh(str(tmp_path / "leapseconds.tls"))
    try:
        start = spiceypy.str2et(START)
        seconds = np.arange(-600.0, STEP * COUNT + 600.0, 30.0)
        handle = spiceypy.spkopn(str(tmp_path / "lantern.bsp"), "test", 0)
        for body, centre, states in ((LANTERN, HARROW, lantern(seconds)), (HARROW, SUN, harrow(seconds))):
            epochs = start + seconds
            ends, table = (epochs[0], epochs[-1]), np.ascontiguousarray(np.hstack(states))
            spiceypy.spkw09(handle, body, centre, "J2000", *ends, f"{body}", 7, len(epochs), table, epochs)
        spiceypy.spkcls(handle)
    finally:
        spiceypy.unload(str(tmp_path / "leapseconds.tls"))
    return tmp_path


@pytest.fixture(scope="module")
def product(filled):
    density = np.full((1, 6, 4, 6), 1e9)
    return filled(GRID, density, density[None], sun_distance=6e10)


def test_kernels_give_the_positions_of_the_table_to_a_metre(folder, product):
    times = STEP * np.arange(COUNT)
    rows = np.column_stack([times, lantern(times)[0], -harrow(times)[0]])
    names = ["time", *(f"{what}_{axis}_km" for what in ("observer", "sun") for axis in "xyz")]
    text = "\n".join([",".join(names), *(",".join(map(repr, map(float, row))) for row in rows)])
    (folder / "path.csv").write_text(text, encoding="utf-8")
    normal = list(map(float, TILT.apply([0.0, 0.0, 1.0])))
    frame = f'frame = "inertial"\ninertial_frame = "J2000"\norbit_normal = {normal}'
    by_table = f'law = "table"\nfile = "path.csv"\n{frame}'
    # The columns of the frame kernel are the axes of LANTERN_AXES in J2000: (a, b, c) there is (c, a, b) here.
    tables = [
        plan_observation(
            product, parse_plan(PLAN.format(observer=observer, direction=direction), folder / "plan.toml")
        )
        for observer, direction in ((KERNELS, [2.0, 3.0, 1.0]), (by_table, [1.0, 2.0, 3.0]))
    ]
    assert [len(table) for table in tables] == [COUNT, COUNT]
    assert list(tables[0]["time"][[0, -1]]) == ["2031-06-01T00:00:00.000", "2031-06-01T01:00:00.000"]
    for axis in "xyz":
        places = [np.asarray(table[f"observer_{axis}_km"]) for table in tables]
        np.testing.assert_allclose(places[0], places[1], rtol=0.0, atol=1e-3)
        looks = [np.asarray(table[f"look_{axis}"]) for table in tables]
        np.testing.assert_allclose(looks[0], looks[1], rtol=0.0, atol=1e-9)
    np.testing.assert_allclose(tables[0]["sun_distance_au"], 6e10 / 1.495978707e11, rtol=1e-9)
    np.testing.assert_allclose(tables[0]["counts"], tables[1]["counts"], rtol=1e-6)


def test_positions_are_those_of_the_orbit_turned_under_the_sun(folder, product):
    table = plan_observation(
        product, parse_plan(PLAN.format(observer=KERNELS, direction=[0, 0, 1]), folder / "plan.toml")
    )
    times = STEP * np.arange(COUNT)
    sun, place = -harrow(times)[0] / DISTANCE, lantern(times)[0]
    north = TILT.apply([0.0, 0.0, 1.0])
    expected = [np.sum(place * sun, axis=1), np.sum(place * np.cross(north, sun), axis=1), place @ north]
    for axis, values in zip("xyz", expected, strict=True):
        np.testing.assert_allclose(table[f"observer_{axis}_km"], values, rtol=0.0, atol=1e-3)


def test_kernels_of_others_stay_loaded_and_ours_do_not(folder, product):
    spiceypy.furnsh(str(folder / "frames.tf"))
    try:
        before = spiceypy.ktotal("ALL")
        plan_observation(
            product, parse_plan(PLAN.format(observer=KERNELS, direction=[0, 0, 1]), folder / "plan.toml")
        )
        assert spiceypy.ktotal("ALL") == before
    finally:
        spiceypy.kclear()


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("lantern.bsp", "none.bsp", r"plan.toml: observer.kernels\[3\]: .*none.bsp"),
        ('"LANTERN"', '"LAMP"', "plan.toml: observer: SPICE says: .*LAMP"),
        ("LANTERN_AXES", "NO_AXES", "plan.toml: observer: SPICE says: "),
        ("01:00:00", "23:00:00", "plan.toml: observer: SPICE says: "),
        ('stop = "2031', 'stop = "2030', "plan.toml: observer.stop: .* is before start"),
        ('"5 min"', '"1 us"', "plan.toml: observer.step: .* exposures; at most"),
    ],
)
def test_what_kernels_do_not_hold_is_one_message(folder, product, old, new, message):
    plan = parse_plan(
        PLAN.format(observer=KERNELS.replace(old, new), direction=[0, 0, 1]), folder / "plan.toml"
    )
    with pytest.raises(InputError, match=message) as refused:
        plan_observation(product, plan)
    assert "\n" not in str(refused.value)
    assert spiceypy.ktotal("ALL") == 0


def test_quaternions_need_a_table(folder, product):
    text = PLAN.format(observer=KERNELS, direction=[0, 0, 1]).replace(
        'law = "direction"\ndirection = [0, 0, 1]', 'law = "table"'
    )
    with pytest.raises(InputError, match=r'pointing\.law: "table" needs observer.law = "table"'):
        plan_observation(product, parse_plan(text, folder / "plan.toml"))


def test_north_of_a_moon_is_that_of_its_hosts_orbit(folder):
    moon = KERNELS.replace('"LANTERN"', '"HARROW"').replace(
        'target = "HARROW"', 'target = "LANTERN"\nhost = "HARROW"'
    )
    plan = parse_plan(PLAN.format(observer=moon, direction=[0, 0, 1]), folder / "plan.toml")
    normals = spice_states(plan, plan.observer).normals
    north = normals / np.linalg.norm(normals, axis=1)[:, None]
    np.testing.assert_allclose(north, np.tile(TILT.apply([0.0, 0.0, 1.0]), (COUNT, 1)), rtol=0.0, atol=1e-9)


def test_a_way_that_turns_back_on_itself_has_no_north(folder):
    plan = parse_plan(PLAN.format(observer=KERNELS, direction=[0, 0, 1]), folder / "plan.toml")
    with pytest.raises(InputError, match=r"name the planet that it goes about as observer\.host"):
        _refuse_turning_normals(plan, plan.observer, np.array([[0.0, 0.1, 1.0], [0.0, 0.1, -1.0]]))
