"""`tracer retention`: tables, figures for machines, messages."""

import json
from pathlib import Path

import pytest

from tracer.__main__ import main

WIND = ("--wind-density", "50 cm-3", "--wind-speed", "400 km/s")
OWN = ("Harrow", "--radius", "1800 km", "--gm", "9500 km3 s-2")


def exit_code(*words: str) -> int:
    """Return the exit code of `tracer retention`; the command returns where all is well."""
    with pytest.raises(SystemExit) as ended:
        main(("retention", *words))
    return ended.value.code or 0


def figures(capsys, *words: str):
    assert exit_code(*words, "--json") == 0
    return json.loads(capsys.readouterr().out)


def test_table_fits_100_columns_and_names_every_speed(capsys):
    assert exit_code("Mercury", "Moon", "Phobos", "Io", *WIND) == 0
    shown = capsys.readouterr()
    assert max(len(line) for line in shown.out.splitlines()) <= 100
    text = " ".join(shown.out.split())
    assert "most probable, mean, rms sqrt(2kT/m), sqrt(8kT/(pi m)), sqrt(3kT/m)" in text
    assert "627.6 K, subsolar equilibrium at that distance, bond albedo 0.08 and emissivity 0.95" in text
    assert shown.err == "Next: tracer new\n"


def test_figures_for_machines_are_those_of_the_formulas(capsys):
    report = figures(capsys, "Moon", "--gas", "O2", "--temperature", "300 K", *WIND)
    body = report["bodies"][0]
    oxygen = body["gases"][0]
    # O2 at 300 K: 395, 446 and 484 m/s, computed for this project
    assert [round(oxygen[f"{name}_speed"]) for name in ("most_probable", "mean", "rms")] == [395, 446, 484]
    assert body["temperature_origin"] == "as given"
    assert body["kept_jeans_parameter"] == pytest.approx(37.10, abs=0.005)
    assert oxygen["leaks_by_six_times_rule"] is (6.0 * oxygen["rms_speed"] > body["escape_speed"])
    assert (body["meets_wind_directly"], body["standoff_flat_sheet"]) == (True, None)
    assert oxygen["photo_lifetime"] is None


def test_mercury_holds_off_the_usual_wind_and_not_a_storm(capsys):
    usual = figures(capsys, "Mercury", *WIND)["bodies"][0]
    # 1.29 and 1.37 radii (Chapman-Ferraro; common practice)
    assert usual["standoff_flat_sheet"] == pytest.approx(1.29, abs=0.005)
    assert usual["standoff_curved_boundary"] == pytest.approx(1.37, abs=0.005)
    assert usual["meets_wind_directly"] is False
    assert exit_code("Mercury", *WIND[:3], "2000 km/s") == 0
    assert "Under one radius: the body meets the wind directly" in " ".join(capsys.readouterr().out.split())


def test_gas_that_flows_out_is_warned_of(capsys):
    assert exit_code("Moon", "--gas", "H", "He") == 0
    text = " ".join(capsys.readouterr().out.split())
    assert "Note: ! H: jeans parameter below 3; a real gas flows out there" in text


def test_gases_may_follow_one_another_or_stand_with_commas(capsys):
    wanted = ["Na", "K", "Ar"]
    for words in (
        ("Moon", "--gas", "Na", "K", "Ar"),
        ("--gas", "Na,K,Ar", "Moon"),
        ("Moon", *(word for gas in wanted for word in ("--gas", gas))),
    ):
        shown = figures(capsys, *words)["bodies"]
        assert [body["name"] for body in shown] == ["Moon"]
        assert sorted(gas["species"] for gas in shown[0]["gases"]) == sorted(wanted)


def test_body_of_ones_own_needs_no_catalogue(capsys):
    body = figures(capsys, *OWN, "--temperature", "600 K", "--gas", "Na")["bodies"][0]
    assert body["escape_speed"] == pytest.approx((2 * 9.5e12 / 1.8e6) ** 0.5, rel=1e-12)
    assert body["distance"] is None
    assert body["gases"][0]["photo_lifetime"] is None


def test_distance_moves_temperature_and_photo_lifetime(capsys):
    near = figures(capsys, "Mercury", "--gas", "Na", "--distance", "0.3075 au")["bodies"][0]
    # Mercury 704 K at 0.3075 au, emissivity 0.95, computed for this project
    assert near["temperature"] == pytest.approx(704.0, abs=0.5)
    assert near["gases"][0]["photo_lifetime"] == pytest.approx(0.3075**2 / 5.9e-6, rel=1e-9)


def test_constants_given_for_a_known_body_are_said_to_replace_the_catalogues(capsys):
    notes = figures(capsys, "Moon", "--gm", "5000 km3 s-2", "--distance", "3 au")["bodies"][0]["notes"]
    assert notes[0] == "gm as given replace the catalogue's values of Moon"
    assert notes[1].startswith("Moon comes no nearer to the Sun than 0.9833 au and no farther than 1.017 au")


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (("Mercry",), 'BODY: "Mercry" is not in the catalogue; did you mean Mercury?'),
        (("moon",), 'BODY: "moon" is not in the catalogue; did you mean Moon?'),
        (("Moon", "--gas", "na"), '--gas: "na" is not in the catalogue; did you mean Na?'),
        (
            OWN[:3],
            '--gm: missing; "Harrow" is not in the catalogue, so give for example --gm "9500 km3 s-2"',
        ),
        (
            OWN,
            '--temperature: missing; "Harrow" is not in the catalogue, so give for example --temperature "600 K"',
        ),
        (("Moon", "Io", *OWN[1:3]), "--radius: goes with one BODY, not with 2"),
        (
            ("Mercury", *WIND[:2]),
            '--wind-speed: missing beside --wind-density; give for example --wind-speed "400 km/s"',
        ),
        (("Moon", "--temperature", "390"), '--temperature: "390" has no unit; write for example "1200 K"'),
        (
            ("Moon", "--field", "3 km"),
            '--field: "3 km": "km" is not a unit of magnetic field; write for example "195 nT"',
        ),
        (
            ("Moon", "--distance", "0 au"),
            '--distance: "0 au" is out of range; must be from 0.01 au to 100000 au',
        ),
        (
            ("Moon", "--plot", "field.jpg"),
            '--plot: "field.jpg" has none of the endings of a figure: .png, .pdf, .svg',
        ),
    ],
)
def test_bad_input_ends_with_2_and_one_line(words, message, capsys):
    assert exit_code(*words) == 2
    shown = capsys.readouterr()
    assert shown.out == ""
    assert shown.err == f"tracer: {message}\n"


def test_another_gas_is_not_taken_for_a_slip(capsys):
    assert exit_code("Moon", "--gas", "SO2") == 2
    assert capsys.readouterr().err.startswith('tracer: --gas: "SO2" is not in the catalogue (H, H2, He, ')


def test_unknown_body_is_told_what_there_is(capsys):
    assert exit_code("Ball") == 2
    message = capsys.readouterr().err
    assert message.startswith('tracer: BODY: "Ball" is not in the catalogue (Mercury, Moon, Ceres, ')
    assert message.endswith("; for a body of your own give --radius and --gm\n")


@pytest.mark.parametrize(("ending", "begin"), [("png", b"\x89PNG"), ("pdf", b"%PDF"), ("svg", b"<?xml")])
def test_figure_is_written_in_the_format_of_its_ending(ending, begin, tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    assert exit_code("Moon", "--gas", "Ar", "--plot", f"field.{ending}") == 0
    assert f"figure: field.{ending}" in capsys.readouterr().out
    assert Path(f"field.{ending}").read_bytes().startswith(begin)
    assert [path.name for path in tmp_path.iterdir()] == [f"field.{ending}"]


def test_existing_figure_is_kept_unless_told_otherwise(tmp_path, capsys):
    path = tmp_path / "field.png"
    path.write_bytes(b"precious")
    assert exit_code("Moon", "--plot", str(path)) == 2
    shown = capsys.readouterr()
    assert shown.err == f"tracer: {path}: exists; --overwrite replaces it, or name another output\n"
    assert path.read_bytes() == b"precious"
    assert exit_code("Moon", "--plot", str(path), "--overwrite", "--json") == 0
    assert json.loads(capsys.readouterr().out)["bodies"]
    assert path.read_bytes() != b"precious"
