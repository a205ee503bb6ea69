"""Observation files: what is refused, and in what words."""

import pytest

from tracer.errors import InputError
from tracer.observe.observationspec.observation import load_observation, parse_observation

OBSERVATION = """
[profile]
file = "p.csv"
position = "x_km"
value = "b_kR"
sigma = "s_kR"
quantity = "brightness"
line = "na_d2"
along = "downtail"
[view]
look_from = "north"
[slit]
width = "2 arcsec"
length = "0.5 radii"
[seeing]
fwhm = "1 arcsec"
[[fit.release]]
name = "vapour"
temperature = ["1500 K", "8 kK"]
"""


def test_defaults_are_filled_in():
    spec = parse_observation(OBSERVATION, "o.toml")
    assert spec.slit.orientation == "along"
    assert spec.seeing.profile == "gaussian"
    assert not spec.background.fitted
    assert spec.fit.release[0].rate == "free"
    assert [str(end) for end in spec.fit.release[0].temperature] == ["1500 K", "8 kK"]
    held = parse_observation(OBSERVATION.replace('["1500 K", "8 kK"]', '"3000 K"'), "o.toml")
    assert [str(end) for end in held.fit.release[0].temperature] == ["3000 K"]


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("sigma", "sigm", "profile.sigm: unknown key; did you mean sigma?"),
        ('line = "na_d2"\n', "", "profile.line: missing; a brightness needs it"),
        ('"brightness"', '"column"', "profile.line: goes with a brightness alone"),
        (
            '"brightness"',
            '"counts"',
            'profile.quantity: "counts" is not allowed; must be "column" or "brightness"',
        ),
        ('"downtail"', '"altitude"', 'profile.side: missing; along = "altitude" needs it'),
        ('"downtail"', '"slit"', 'profile.direction: missing; along = "slit" needs it'),
        ('"downtail"', '"downtail"\nside = "dawn"', 'profile.side: goes with along = "altitude" alone'),
        ('"s_kR"', '"b_kR"', 'profile.sigma: "b_kR" is already the column of value'),
        ('look_from = "north"', "", "view.look_from: missing; must be given, or phase_angle"),
        ('"north"', '"north"\nphase_angle = "90 deg"', "view.phase_angle: look_from is given as well"),
        ('"north"', '"up"', 'view.look_from: "up" is not a direction'),
        ('"2 arcsec"', '"2 K"', 'slit.width: "2 K": "K" is not a unit of length'),
        ('"2 arcsec"', '"-2 arcsec"', 'slit.width: "-2 arcsec" is out of range; must be above 0'),
        ('"2 arcsec"', "2", "slit.width: 2 has no unit"),
        ('"1 arcsec"', '"1 arcsec"\nprofile = "moffat"', "seeing.beta: missing; a Moffat function needs it"),
        ('"1 arcsec"', '"1 arcsec"\nbeta = 2.5', 'seeing.beta: goes with "moffat" alone'),
        ('["1500 K", "8 kK"]', '["8 kK", "1500 K"]', "is no range; the first must be below the second"),
        ('["1500 K", "8 kK"]', '["1500 K"]', "fit.release[1].temperature: "),
        ('["1500 K", "8 kK"]', '["1500 km", "8 kK"]', '"km" is not a unit of temperature'),
        (
            'name = "vapour"',
            'name = "vapour"\nlaw = "sigmund-thompson"',
            'fit.release[1].temperature: is no parameter of law "sigmund-thompson"',
        ),
        (
            '[[fit.release]]\nname = "vapour"',
            '[[fit.release]]\nname = "vapour"\n[[fit.release]]\nname = "vapour"',
            'fit.release[2].name: "vapour" is already the name of release[1]',
        ),
        (
            "[slit]",
            '[background]\nfitted = true\nlevel = "1 kR"\n[slit]',
            "background.level: goes with fitted = false",
        ),
        ("[profile]", "[profile", "not TOML"),
    ],
)
def test_mistakes_are_named_by_key_value_and_what_is_allowed(old, new, message):
    with pytest.raises(InputError) as refused:
        parse_observation(OBSERVATION.replace(old, new, 1), "o.toml")
    assert str(refused.value).startswith("o.toml: ")
    assert message in str(refused.value)


def test_missing_file_is_named(tmp_path):
    with pytest.raises(InputError, match=r"none\.toml: no such file"):
        load_observation(tmp_path / "none.toml")
