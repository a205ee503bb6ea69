"""Plan files: what is refused, and in what words."""

from pathlib import Path

import pytest

from tracer.errors import InputError
from tracer.observe.planspec.plan import load_plan, parse_plan

PLAN = Path(__file__).with_name("limb-plan.toml").read_text(encoding="utf-8")
SPICE = """law = "spice"
kernels = ["a.bsp"]
observer = "LANTERN"
target = "HARROW"
start = "2031-06-01"
stop = "2031-06-02"
step = "60 s"
"""


def test_defaults_are_filled_in():
    plan = parse_plan(PLAN, "plan.toml")
    assert plan.spectrometer.field_of_view.samples == (3, 3)
    assert plan.spectrometer.wanted_snr == 10.0
    assert str(plan.spectrometer.dark_rate) == "0 s-1"
    assert plan.observer.frame == "sun-fixed"
    spice = parse_plan(PLAN.replace('law = "table"\nfile = "path.csv"\n', SPICE), "plan.toml")
    assert (spice.observer.sun, spice.observer.frame) == ("SUN", "J2000")


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("exposure", "exposur", "spectrometer.exposur: unknown key; did you mean exposure?"),
        ('"10 s"', "10", 'spectrometer.exposure: 10 has no unit; write for example "30 d"'),
        ('"10 s"', '"10 km"', 'spectrometer.exposure: "10 km": "km" is not a unit of time'),
        ('"10 cm2"', '"10 cm"', 'spectrometer.collecting_area: "10 cm": "cm" is not a unit of area'),
        ('"10 cm2"', '"0 cm2"', 'spectrometer.collecting_area: "0 cm2" is out of range; must be above 0 m2'),
        ('"30 deg"', '"190 deg"', 'spectrometer.sun_keep_out: "190 deg" is out of range'),
        ('"0.2 deg"', '"200 deg"', 'spectrometer.field_of_view.width: "200 deg" is out of range'),
        ("throughput = 0.1", "throughput = 1.1", "spectrometer.line[1].throughput: 1.1 is out of range"),
        ("throughput = 0.1", "", "spectrometer.line[1].throughput: missing"),
        ('[[spectrometer.line]]\nname = "na_d2"\nthroughput = 0.1\n', "", "spectrometer.line: missing"),
        (
            "throughput = 0.1",
            'throughput = 0.1\n[[spectrometer.line]]\nname = "na_d2"\nthroughput = 0.1',
            'spectrometer.line[2].name: "na_d2" is already the name of line[1]',
        ),
        ('side = "dawn"', 'side = "down"', 'pointing.side: "down" is not allowed; must be "dawn" or "dusk"'),
        (
            '"tangent-altitude"',
            '"tangent"',
            'pointing.law: "tangent" is not a law; must be one of "direction"',
        ),
        (
            'law = "tangent-altitude"\naltitude = "200 km"\nside = "dawn"',
            'law = "direction"\ndirection = [0, 0, 0]',
            "pointing.direction: [0, 0, 0] has no length",
        ),
        (
            'file = "path.csv"',
            'file = "p.csv"\nframe = "inertial"',
            "observer.inertial_frame: missing; frame =",
        ),
        (
            'file = "path.csv"',
            'file = "p.csv"\norbit_normal = [0, 0, 1]',
            "observer.orbit_normal: goes with frame",
        ),
        (
            'law = "table"\nfile = "path.csv"\n',
            SPICE.replace('["a.bsp"]', "[]"),
            "observer.kernels: [] is empty",
        ),
        ('title = "Test"', "", "title: missing; must be text"),
        ("title", "title = ", "line 2, column"),
    ],
)
def test_mistakes_are_named_by_key_value_and_what_is_allowed(old, new, message):
    with pytest.raises(InputError) as refused:
        parse_plan(PLAN.replace(old, new, 1), "plan.toml")
    assert str(refused.value).startswith("plan.toml: ")
    assert message in str(refused.value)


def test_missing_file_and_folder_are_named(tmp_path):
    with pytest.raises(InputError, match=r"none\.toml: no such file"):
        load_plan(tmp_path / "none.toml")
    with pytest.raises(InputError, match="is a folder; must be a plan file"):
        load_plan(tmp_path)
