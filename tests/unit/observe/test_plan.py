"""A plan's rows: path, pointing, field of view, limits."""

import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from tracer.errors import InputError
from tracer.observe.gas import gas_of
from tracer.observe.limits import least_angle
from tracer.observe.plan import observation_of, plan_observation
from tracer.observe.plan_summary import summarize
from tracer.observe.planspec.plan import parse_plan
from tracer.observe.planspec.spectrometer import FieldOfView
from tracer.observe.pointing import Attitude, directions, field_samples, rotations
from tracer.observe.sightlines import sightlines
from tracer.observe.sights import unit
from tracer.observe.true_anomaly import true_anomalies
from tracer.tally.axes import make_grid

RADIUS = 1.8e6
GRID = make_grid(RADIUS, 5e4, 9e6, 12, 6, 8)
AU = 1.495978707e11

PLAN = Path(__file__).with_name("limb-plan.toml").read_text(encoding="utf-8")
PATH = """time,observer_x_km,observer_y_km,observer_z_km
0,5000,100,0
60,4000,200,3000
120,-100,300,5000
180,-4000,400,3000
"""
FIXED = 'law = "direction"\ndirection = [-1, 0.2, 0.1]'
LIMB = 'law = "tangent-altitude"\naltitude = "200 km"\nside = "dawn"'


@pytest.fixture(scope="module")
def product(filled):
    random = np.random.default_rng(6)
    shape = (2, 12, 6, 8)
    fall = np.exp(-np.arange(12.0))[:, None, None]
    density = 1e9 * fall * random.uniform(0.5, 1.5, shape)
    groups = random.normal(1.0, 0.1, (5, 2, 1, 1, 1)) * density
    return filled(
        GRID,
        density,
        density[None],
        replicates=groups,
        emission_replicates=groups[:, None],
        sun_distance=0.35 * AU,
        sun_radial_velocity=-5e3,
        run_file='[body]\nname = "Harrow"\norbit = { semi_major_axis = "0.42 au", eccentricity = 0.18 }\n',
    )


@pytest.fixture
def planned(product, tmp_path):
    """Return a function that makes the table of a plan file's text and a path."""

    def make(text: str = PLAN, path: str = PATH):
        (tmp_path / "path.csv").write_text(path, encoding="utf-8")
        return plan_observation(product, parse_plan(text, tmp_path / "plan.toml"))

    return make


def vectors(table, name: str) -> np.ndarray:
    endings = ("", "_km")
    ending = next(end for end in endings if f"{name}_x{end}" in table.colnames)
    return np.stack([np.asarray(table[f"{name}_{axis}{ending}"]) for axis in "xyz"], axis=1)


@pytest.mark.parametrize(
    ("side", "toward"),
    [
        ("dawn", (0, -1, 0)),
        ("dusk", (0, 1, 0)),
        ("north", (0, 0, 1)),
        ("south", (0, 0, -1)),
        ("sunward", (1, 0, 0)),
        ("tailward", (-1, 0, 0)),
    ],
)
def test_limb_is_touched_at_its_altitude_on_its_side(planned, side, toward):
    table = planned(PLAN.replace('"dawn"', f'"{side}"'))
    np.testing.assert_allclose(table["tangent_altitude_km"], 200.0, rtol=1e-9)
    places, looks = vectors(table, "observer"), vectors(table, "look")
    tangents = places - np.sum(places * looks, axis=1)[:, None] * looks
    # Of all places on the limb's ring this one lies farthest to the side: nothing is left across it.
    across = np.cross(places, tangents)
    np.testing.assert_allclose(across @ np.array(toward) / np.abs(across).max(), 0.0, atol=1e-9)
    out = unit(places)
    aside = np.array(toward) - (out @ np.array(toward))[:, None] * out
    assert np.all(np.sum(tangents * aside, axis=1) > 0.0)


def test_scan_steps_through_its_altitudes_and_begins_again(planned):
    scan = 'law = "altitude-scan"\naltitude = ["50 km", "0.5 radii"]\nsteps = 3\nside = "north"'
    table = planned(PLAN.replace(LIMB, scan))
    np.testing.assert_allclose(table["tangent_altitude_km"], [50.0, 475.0, 900.0, 50.0], rtol=1e-9)


def test_sweep_looks_at_points_of_the_tail(planned):
    sweep = 'law = "tail-sweep"\ndowntail = ["2 radii", "9000 km"]\nsteps = 4'
    table = planned(PLAN.replace(LIMB, sweep))
    places, looks = vectors(table, "observer"), vectors(table, "look")
    targets = np.array([[-x, 0.0, 0.0] for x in (3600.0, 5400.0, 7200.0, 9000.0)])
    np.testing.assert_allclose(looks, unit(targets - places), rtol=1e-12, atol=1e-15)


def test_quaternions_turn_the_boresight(planned):
    rotation = Rotation.random(4, random_state=1)
    x, y, z, w = rotation.as_quat().T
    lines = PATH.splitlines()
    lines[0] += ",quaternion_w,quaternion_x,quaternion_y,quaternion_z"
    for row in range(4):
        lines[row + 1] += f",{w[row]!r},{x[row]!r},{y[row]!r},{z[row]!r}".replace("np.float64(", "").replace(
            ")", ""
        )
    table = planned(
        PLAN.replace(LIMB, 'law = "table"\nboresight = [1, 0, 0]\nupward = [0, 0, 1]'), "\n".join(lines)
    )
    np.testing.assert_allclose(vectors(table, "look"), rotation.apply([1.0, 0.0, 0.0]), atol=1e-12)
    np.testing.assert_allclose(rotations(np.stack([w, x, y, z], axis=1)), rotation.as_matrix(), atol=1e-14)


def test_look_vectors_of_the_table_are_those_of_the_same_directions(planned):
    lines = PATH.splitlines()
    table = planned(PLAN.replace(LIMB, FIXED))
    text = "\n".join([lines[0] + ",look_x,look_y,look_z", *(line + ",-2,0.4,0.2" for line in lines[1:])])
    same = planned(PLAN.replace(LIMB, 'law = "table"'), text)
    np.testing.assert_array_equal(same["column_m2"], table["column_m2"])


def test_inertial_path_gives_what_the_sun_fixed_one_gives(planned, tmp_path):
    turn = Rotation.from_euler("xyz", [20.0, -40.0, 70.0], degrees=True)
    fixed = np.array([[float(part) for part in line.split(",")] for line in PATH.splitlines()[1:]])
    places, sun = turn.apply(fixed[:, 1:]), turn.apply([0.35 * AU / 1e3, 0.0, 0.0])
    rows = [
        ",".join(repr(float(part)) for part in (time, *place, *sun))
        for time, place in zip(fixed[:, 0], places, strict=True)
    ]
    head = "time,observer_x_km,observer_y_km,observer_z_km,sun_x_km,sun_y_km,sun_z_km"
    normal = list(map(float, 3.0 * turn.apply([0.1, 0.0, 1.0])))
    frame = f'file = "path.csv"\nframe = "inertial"\ninertial_frame = "ICRF"\norbit_normal = {normal}'
    direction = list(map(float, turn.apply([-1.0, 0.2, 0.1])))
    text = PLAN.replace('file = "path.csv"', frame)
    text = text.replace(LIMB, f'law = "direction"\ndirection = {direction}')
    table = planned(text, "\n".join([head, *rows]))
    expected = planned(PLAN.replace(LIMB, FIXED))
    np.testing.assert_allclose(vectors(table, "observer"), vectors(expected, "observer"), atol=1e-6)
    assert (table.meta["path_frame"], expected.meta["path_frame"]) == ("ICRF", "Sun-fixed")
    for name in ("column_m2", "snr", "sun_angle_deg", "phase_angle_deg", "sun_distance_au"):
        np.testing.assert_allclose(table[name], expected[name], rtol=1e-9)


def test_row_is_the_mean_of_sight_lines_over_the_field(planned, product):
    text = PLAN.replace("height = ", "samples = [2, 3], roll = '25 deg', height = ")
    text = text.replace('"0.2 deg"', '"8 deg"').replace('"0.1 deg"', '"5 deg"')
    table = planned(text)
    places, looks = vectors(table, "observer"), vectors(table, "look")
    # The same field by hand: height runs away from the body, width is look x height, both turned by the roll.
    up = unit(places - np.sum(places * looks, axis=1)[:, None] * looks)
    across = np.cross(looks, up)
    c, s = math.cos(math.radians(25.0)), math.sin(math.radians(25.0))
    height, width = c * up + s * across, c * across - s * up
    total, weights = np.zeros(4), 0.0
    for a in (-2.0, 2.0):
        for b in (-5.0 / 3.0, 0.0, 5.0 / 3.0):
            edges = [
                np.tan(np.radians([a - 2.0, a + 2.0])),
                np.tan(np.radians([b - 5.0 / 6.0, b + 5.0 / 6.0])),
            ]
            corner = np.arctan(np.outer(*edges) / np.sqrt(1.0 + edges[0][:, None] ** 2 + edges[1] ** 2))
            weight = corner[1, 1] - corner[0, 1] - corner[1, 0] + corner[0, 0]
            rays = looks + np.tan(np.radians(a)) * width + np.tan(np.radians(b)) * height
            columns = dict(zip(("observer_x_km", "observer_y_km", "observer_z_km"), places.T, strict=True))
            columns |= dict(zip(("look_x", "look_y", "look_z"), rays.T, strict=True))
            total += weight * np.asarray(sightlines(product, columns)["brightness_na_d2_rayleigh"])
            weights += weight
    np.testing.assert_allclose(table["brightness_na_d2_rayleigh"], total / weights, rtol=1e-9)
    solid_angle = 4.0 * math.asin(math.sin(math.radians(4.0)) * math.sin(math.radians(2.5)))
    rate = total / weights * 1e10 / (4.0 * math.pi) * 1e-3 * solid_angle * 0.1
    np.testing.assert_allclose(table["counts"], 10.0 * rate, rtol=1e-9)
    np.testing.assert_allclose(table["snr"], np.sqrt(10.0 * rate), rtol=1e-9)
    np.testing.assert_allclose(table["exposure_for_wanted_snr_s"], 100.0 / rate, rtol=1e-9)
    # S t / sqrt(S t): the error of the ratio is half that of the counts, relative.
    np.testing.assert_allclose(
        table["snr_standard_error"] / table["snr"],
        0.5 * table["counts_standard_error"] / table["counts"],
        rtol=1e-9,
    )
    relative = table["brightness_na_d2_standard_error_rayleigh"] / table["brightness_na_d2_rayleigh"]
    np.testing.assert_allclose(table["counts_standard_error"] / table["counts"], relative, rtol=1e-5)


def test_other_counts_are_dark_background_and_scattered_sunlight(planned, tmp_path):
    (tmp_path / "stray.csv").write_text("sun_angle_deg,rate_per_s\n10,1000\n100,100\n", encoding="utf-8")
    more = (
        'dark_rate = "2 s-1"\nbackground_rate = "180 min-1"\nscattered_sunlight = { file = "stray.csv" }\n'
        "read_noise = 3\nreads = 5\nfull_well = 4000\n"
    )
    text = PLAN.replace(LIMB, 'law = "direction"\ndirection = [0, 1, 0]').replace(
        "sun_keep_out", more + "sun_keep_out"
    )
    table = planned(text)
    rates = np.interp(table["sun_angle_deg"], [10.0, 100.0], [1000.0, 100.0])
    np.testing.assert_allclose(table["other_counts"], 10.0 * (5.0 + rates), rtol=1e-12)
    noise = np.sqrt(table["counts"] + table["other_counts"] + 45.0)
    np.testing.assert_allclose(table["snr"], table["counts"] / noise, rtol=1e-12)
    np.testing.assert_array_equal(table["saturated"], table["counts"] + table["other_counts"] > 4000.0)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("sun_angle_deg,rate_per_s\n10,5\n10,4\n", "stray.csv: row 2, column sun_angle_deg: 10 is not above"),
        ("sun_angle_deg,rate_per_s\n10,-5\n", "stray.csv: row 1, column rate_per_s: -5 is not allowed"),
        (
            "sun_angle_deg,rate\n10,5\n",
            "stray.csv: column rate_per_s: missing; the table has sun_angle_deg, rate",
        ),
    ],
)
def test_bad_tables_of_scattered_sunlight_are_refused(planned, tmp_path, text, message):
    (tmp_path / "stray.csv").write_text(text, encoding="utf-8")
    with pytest.raises(InputError) as refused:
        planned(PLAN.replace("sun_keep_out", 'scattered_sunlight = { file = "stray.csv" }\nsun_keep_out'))
    assert message in str(refused.value)


def test_true_anomaly_is_that_of_the_distance_on_the_way_in(planned):
    table = planned()
    p = 0.42 * (1.0 - 0.18**2)
    anomaly = 360.0 - math.degrees(math.acos((p / 0.35 - 1.0) / 0.18))
    np.testing.assert_allclose(table["true_anomaly_deg"], anomaly, rtol=1e-9)
    np.testing.assert_allclose(table["sun_distance_au"], 0.35)


def test_a_distance_that_stays_but_for_rounding_does_not_turn_the_orbit_round(product):
    # The body comes in, and a distance read back from vectors wavers in its last digits.
    wavering = 0.35 * AU * (1.0 + 2e-16 * np.array([0.0, 1.0, -1.0, 2.0, 0.0, 1.0]))
    found = true_anomalies(gas_of(product), wavering, 6)
    assert np.all(found > 180.0)
    np.testing.assert_allclose(found, found[0], rtol=1e-9)


def test_an_observer_over_the_middle_of_a_side_has_no_limb_there_whatever_rounding_leaves(planned):
    path = PATH.splitlines()[0] + "\n0,1e-13,-5000,2e-13\n"
    with pytest.raises(InputError, match="stands straight over the dawn side, which has no limb for him"):
        planned(path=path)


def test_rows_inside_a_keep_out_are_marked_as_not_to_be_commanded(planned):
    to_the_sun = planned(PLAN.replace(LIMB, 'law = "direction"\ndirection = [1, 0.5, 0]'))
    assert np.all(to_the_sun["sun_keep_out"])
    assert np.all(to_the_sun["do_not_command"])
    assert all(
        str(words) == "NOT to be commanded: Sun inside its keep-out" for words in to_the_sun["command"]
    )
    assert "flight rules" in to_the_sun.meta["caution"]
    low = planned(PLAN.replace("sun_keep_out", 'body_keep_out = "250 km"\nsun_keep_out'))
    assert np.all(low["body_keep_out"])
    assert np.all(low["do_not_command"])
    assert not np.any(low["body_in_field"])
    high = planned(PLAN.replace("sun_keep_out", 'body_keep_out = "150 km"\nsun_keep_out'))
    assert not np.any(high["body_keep_out"])
    down = planned(PLAN.replace(LIMB, 'law = "direction"\ndirection = [-1, 0, 0]'))
    assert down["body_in_field"][0]
    assert not down["body_keep_out"][0]
    assert summarize(down, 10.0).usable < 4


def test_wide_field_that_only_touches_the_body_has_it_in_the_field(planned):
    # At 200 km tangent altitude and 5000 km from the centre the ground is 2.6 deg below the line of sight.
    for height, seen in (("4 deg", False), ("6 deg", True)):
        table = planned(PLAN.replace('height = "0.1 deg"', f'height = "{height}"'))
        assert table["body_in_field"][0] == seen


def test_line_of_sight_that_misses_the_grid_is_flagged(planned):
    far = planned(PLAN.replace(LIMB, FIXED), PATH.replace("0,5000,100,0", "0,5000,100000,0", 1))
    assert far["outside_grid"][0]
    assert far["column_m2"][0] == 0.0
    assert far["snr"][0] == 0.0
    assert far["exposure_for_wanted_snr_s"][0] == np.inf


ANGLE = st.floats(0.01, 100.0)


@given(
    width=ANGLE,
    height=ANGLE,
    roll=st.floats(-180.0, 180.0),
    keep_out=st.floats(0.0, 180.0),
    seed=st.integers(0, 2**31),
)
@settings(deadline=None)
def test_sun_inside_the_keep_out_is_always_flagged(width, height, roll, keep_out, seed):
    random = np.random.default_rng(seed)
    look, other = unit(random.normal(size=(2, 50, 3)).reshape(-1, 3)).reshape(2, 50, 3)
    up = unit(np.cross(look, other))
    stand = Attitude(look, up, np.cross(look, up))
    field = FieldOfView.model_validate(
        {"width": f"{width} deg", "height": f"{height} deg", "roll": f"{roll} deg", "samples": [9, 9]}
    )
    suns = 5e10 * unit(look + random.normal(size=(50, 3)) * random.choice([0.01, 0.1, 1.0, 3.0], (50, 1)))
    found = least_angle(stand, field, suns)
    rays = directions(stand, field_samples(field), roll)
    angles = np.degrees(np.arccos(np.clip(np.einsum("nmi,ni->nm", rays, suns / 5e10), -1.0, 1.0)))
    # Whatever part of the field has the Sun inside its keep-out, the least angle knows it; and it finds no Sun
    # nearer than a field's diagonal allows.
    assert np.all((found <= keep_out) | (angles.min(axis=1) > keep_out - 1e-6))
    assert np.all(found >= angles.min(axis=1) - math.hypot(width, height) / 9.0 - 1e-6)


@pytest.mark.parametrize(
    ("path", "message"),
    [
        (PATH.replace("time", "when"), "path.csv: column time: missing; the table has when, observer_x_km"),
        (PATH.replace("observer_y_km", "y"), "path.csv: column observer_y_km: missing"),
        (PATH.replace("120,-100", "120,nan"), "path.csv: row 3, column observer_x_km: nan is not allowed"),
        (PATH.replace("\n120,", "\n60,"), "path.csv: row 3, column time: 60 is not later than 60 in row 2"),
        (
            PATH.replace("120,-100,300,5000", "120,-100,300,500"),
            "path.csv: row 3, columns observer_x_km, observer_y_km",
        ),
        (
            PATH.replace("120,-100,300,5000", "120,-100,300,1900"),
            "plan.toml: pointing: at exposure 3 the observer",
        ),
        ("", "path.csv: has no rows"),
    ],
)
def test_bad_paths_are_refused_with_row_and_column(planned, path, message):
    with pytest.raises(InputError) as refused:
        planned(path=path)
    assert message in str(refused.value)


def test_zero_look_vectors_and_stray_quaternions_are_refused(planned):
    lines = PATH.splitlines()
    text = "\n".join([lines[0] + ",look_x,look_y,look_z", *(line + ",0,0,0" for line in lines[1:])])
    with pytest.raises(
        InputError, match="row 1, columns look_x, look_y, look_z: the look vector has no length"
    ):
        planned(PLAN.replace(LIMB, 'law = "table"'), text)
    head = lines[0] + ",quaternion_w,quaternion_x,quaternion_y,quaternion_z"
    text = "\n".join([head, *(line + ",1,1,0,0" for line in lines[1:])])
    with pytest.raises(
        InputError, match=r"row 1, columns quaternion_w.*: their length is 1.41421; must be 1"
    ):
        planned(PLAN.replace(LIMB, 'law = "table"'), text)
    with pytest.raises(InputError, match="column look_x: missing"):
        planned(PLAN.replace(LIMB, 'law = "table"'))


def test_unknown_line_and_missing_replicates_are_refused(planned, product, tmp_path):
    with pytest.raises(
        InputError, match=r'plan.toml: spectrometer.line\[1\].name: "na_d1" is no line of the product'
    ):
        planned(PLAN.replace("na_d2", "na_d1"))
    (tmp_path / "path.csv").write_text(PATH, encoding="utf-8")
    bare = product.drop_vars("emission_rate_replicates")
    with pytest.raises(InputError, match="there are no emission_rate_replicates"):
        plan_observation(bare, parse_plan(PLAN, tmp_path / "plan.toml"))


def test_windows_are_runs_of_usable_rows_the_best_first(product, tmp_path):
    rows = "\n".join(f"{60 * i},{6000 - 10 * i},{100 + i},{10 * i}" for i in range(20))
    (tmp_path / "path.csv").write_text(PATH.splitlines()[0] + "\n" + rows, encoding="utf-8")
    table = observation_of(gas_of(product, ["na_d2"]), parse_plan(PLAN, tmp_path / "plan.toml"))
    table["snr"] = [5.0] * 3 + [20.0] * 4 + [1.0] + [30.0] * 3 + [5.0] * 9
    table["do_not_command"][5] = True
    summary = summarize(table, 15.0)
    assert (summary.exposures, summary.forbidden, summary.usable, summary.reaching) == (20, 1, 19, 6)
    assert [(window.first, window.last) for window in summary.windows] == [(8, 10), (3, 4), (6, 6)]
    assert summary.windows[0].total_snr == pytest.approx(30.0 * math.sqrt(3.0))
    none_reaches = summarize(table, 100.0)
    assert none_reaches.reaching == 0
    assert [(window.first, window.last) for window in none_reaches.windows] == [(6, 19), (0, 4)]
