"""Tables of measured profiles: what is read, and what is refused in what words."""

import numpy as np
import pytest

from tracer.errors import InputError
from tracer.observe.fit.profile import read_profile
from tracer.observe.observationspec.observation import parse_observation

OBSERVATION = """
[profile]
file = "p.csv"
position = "downtail_radii"
value = "brightness_kR"
sigma = "sigma"
quantity = "brightness"
line = "na_d2"
along = "downtail"
[view]
look_from = "north"
"""
TABLE = """downtail_radii,brightness_kR,sigma,limit
1,20,1,false
2,10,1,false
3,5,1,true
"""


def read(tmp_path, table=TABLE, old="", new="", name="p.csv"):
    (tmp_path / name).write_text(table, encoding="utf-8")
    text = (
        OBSERVATION.replace("p.csv", name).replace(old, new, 1) if old else OBSERVATION.replace("p.csv", name)
    )
    return read_profile(parse_observation(text, tmp_path / "o.toml"))


def test_units_come_from_the_endings_of_columns(tmp_path):
    profile = read(tmp_path)
    np.testing.assert_allclose(profile.value, [2e4, 1e4, 5e3])
    # Without a unit of its own the standard error has that of the value.
    np.testing.assert_allclose(profile.sigma, [1e3, 1e3, 1e3])
    assert (profile.position_unit, profile.value_unit) == ("radii", "kR")
    assert not profile.upper.any()


def test_units_come_from_keys_and_from_ecsv_as_well(tmp_path):
    plain = TABLE.replace("downtail_radii", "x").replace("brightness_kR", "b")
    keys = 'value = "b"\nposition_unit = "km"\nvalue_unit = "R"'
    text = OBSERVATION.replace('value = "brightness_kR"', keys).replace("downtail_radii", "x")
    (tmp_path / "p.csv").write_text(plain, encoding="utf-8")
    profile = read_profile(parse_observation(text, tmp_path / "o.toml"))
    np.testing.assert_allclose(profile.value, [20.0, 10.0, 5.0])
    ecsv = (
        "# %ECSV 1.0\n# ---\n# datatype:\n# - {name: x, unit: km, datatype: float64}\n"
        "# - {name: b, unit: kR, datatype: float64}\n# - {name: sigma, unit: R, datatype: float64}\n"
        "x b sigma\n1 20 500\n2 10 500\n3 5 500\n"
    )
    (tmp_path / "p.ecsv").write_text(ecsv, encoding="utf-8")
    text = OBSERVATION.replace("p.csv", "p.ecsv").replace("downtail_radii", "x").replace("brightness_kR", "b")
    profile = read_profile(parse_observation(text, tmp_path / "o.toml"))
    np.testing.assert_allclose(profile.value, [2e4, 1e4, 5e3])
    np.testing.assert_allclose(profile.sigma, 500.0)


def test_marked_rows_are_upper_limits(tmp_path):
    profile = read(tmp_path, old='sigma = "sigma"', new='sigma = "sigma"\nupper_limit = "limit"')
    np.testing.assert_array_equal(profile.upper, [False, False, True])


def test_rows_may_fall_and_repeat_a_position(tmp_path):
    profile = read(tmp_path, TABLE.replace("1,20", "3,20").replace("3,5", "2,5"))
    np.testing.assert_array_equal(profile.position, [3.0, 2.0, 2.0])


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("2,10,1", "2,10,-1", "row 2, column sigma: -1 is not allowed; must be above 0"),
        ("2,10,1", "2,10,0", "row 2, column sigma: 0 is not allowed; must be above 0"),
        (
            "2,10,1",
            "2,1e308,1",
            "row 2, column brightness_kR: 1e+308 is not allowed; must be at most 1e+60 R in size",
        ),
        (
            "2,10,1",
            "2,10,1e300",
            "row 2, column sigma: 1e+300 is not allowed; must be at most 1e+60 R in size",
        ),
        ("2,10,1", "2,10,1e-300", "row 2, column sigma: 1e-300 is not allowed; must be at least 1e-60 R"),
        ("2,10,1", "0.5,10,1", "row 2, column downtail_radii: 0.5 turns back behind 1"),
        ("2,10,1", "2,nan,1", "row 2, column brightness_kR: nan is not allowed; must be a finite number"),
        ("2,10,1", "2,,1", "row 2, column brightness_kR: missing"),
        ("2,10,1", "2,ten,1", 'row 2, column brightness_kR: "ten" is not a number'),
        (
            "brightness_kR",
            "brightness",
            "column brightness_kR: missing; the table has downtail_radii, brightness",
        ),
    ],
)
def test_bad_rows_are_named(tmp_path, old, new, message):
    with pytest.raises(InputError) as refused:
        read(tmp_path, TABLE.replace(old, new, 1))
    assert str(refused.value).startswith(str(tmp_path / "p.csv"))
    assert message in str(refused.value)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("downtail_radii", "x", "column x: has no unit; name it with profile.position_unit"),
        ("brightness_kR", "b", "column b: has no unit; name it with profile.value_unit"),
        (
            "brightness_kR",
            "b_cm2",
            'column b_cm2: its unit "cm-2" is none of a brightness, which is in kR or R',
        ),
        ("downtail_radii", "x_K", "column x_K: has no unit"),
    ],
)
def test_missing_and_wrong_units_are_named(tmp_path, old, new, message):
    with pytest.raises(InputError) as refused:
        read(tmp_path, TABLE.replace(old, new, 1), old, new)
    assert message in str(refused.value)


def test_units_that_contradict_are_refused(tmp_path):
    with pytest.raises(InputError, match='value_unit is "R", the column itself says "kR"'):
        read(tmp_path, TABLE, 'sigma = "sigma"', 'sigma = "sigma"\nvalue_unit = "R"')


def test_upper_limits_alone_are_refused(tmp_path):
    limits = TABLE.replace("false", "true")
    with pytest.raises(InputError, match="every row is an upper limit"):
        read(tmp_path, limits, 'sigma = "sigma"', 'sigma = "sigma"\nupper_limit = "limit"')
    with pytest.raises(InputError, match='row 1, column limit: "maybe" is not allowed'):
        read(
            tmp_path,
            TABLE.replace("false", "maybe"),
            'sigma = "sigma"',
            'sigma = "sigma"\nupper_limit = "limit"',
        )
