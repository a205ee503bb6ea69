"""`tracer catalogue`: what the package carries, with sources."""

import json

import pytest

from tracer.__main__ import main
from tracer.catalogue.lines import lines
from tracer.catalogue.load import bodies, gases


def exit_code(*words: str) -> int:
    with pytest.raises(SystemExit) as ended:
        main(("catalogue", *words))
    return ended.value.code or 0


@pytest.mark.parametrize("part", ["bodies", "gases", "lines"])
def test_part_fits_100_columns_and_states_its_sources(part, capsys):
    assert exit_code(part) == 0
    shown = capsys.readouterr().out
    assert max(len(line) for line in shown.splitlines()) <= 100
    assert f"\n  {part}.csv\n" in shown
    assert "memory" in shown


def test_gases_say_how_each_photo_rate_is_known(capsys):
    assert exit_code("gases") == 0
    shown = " ".join(capsys.readouterr().out.split())
    # photo_rates_1au.csv, basis of Na and of H2
    assert "Na HKL92 theoretical cross section (memory); HM15 7.26e-6 (memory); Heays 5.3e-6" in shown
    assert "H2 HKL92 (memory); all channels" in shown


def test_all_three_in_short_name_every_entry_and_where_the_sources_are(capsys):
    assert exit_code() == 0
    shown = capsys.readouterr().out
    assert max(len(line) for line in shown.splitlines()) <= 100
    first_words = {line.split()[0] for line in shown.splitlines() if line.strip()}
    assert first_words > {*bodies(), *gases(), *lines()}
    assert "tracer catalogue bodies, gases or lines" in shown


def test_lines_say_whether_g_is_known_and_over_which_velocities(capsys):
    assert exit_code("lines", "--json") == 0
    entries = {entry["name"]: entry for entry in json.loads(capsys.readouterr().out)["lines"]["entries"]}
    assert (entries["mg_2852"]["g_from"], entries["mg_2852"]["g_velocity_from"]) == (None, None)
    assert entries["al_3944"]["g_velocity_from"] == -20e3
    # The residual flux reaches 1.5 angstrom to either side of 5889.95 angstrom: v = c 1.5/5889.95 = 76.35 km/s
    assert entries["na_d2"]["g_velocity_to"] == pytest.approx(76.35e3, abs=10.0)
    assert entries["na_d2"]["g_from"] == "residual flux"


def test_figures_for_machines_are_in_si(capsys):
    assert exit_code("--json") == 0
    parts = json.loads(capsys.readouterr().out)
    mercury = parts["bodies"]["entries"][0]
    # bodies.csv: GM 22031.869 km3 s-2, R 2439.4 km, field 195 nT
    expected = (2.2031869e13, 2.4394e6, 1.95e-7)
    assert (mercury["gm"], mercury["radius"], mercury["equatorial_field"]) == pytest.approx(expected)
    oxygen = next(entry for entry in parts["gases"]["entries"] if entry["species"] == "O2")
    assert oxygen["photo_rate_quiet"] is None
    assert set(parts) == {"bodies", "gases", "lines"}
    assert all(text for part in parts.values() for text in part["sources"].values())


@pytest.mark.parametrize(
    ("word", "message"),
    [
        ("gass", '"gass" is no part of the catalogue; did you mean gases?'),
        ("comets", '"comets" is no part of the catalogue; must be one of bodies, gases, lines'),
    ],
)
def test_unknown_part_ends_with_2(word, message, capsys):
    assert exit_code(word) == 2
    assert capsys.readouterr().err == f"tracer: {message}\n"
