"""The command line in process: what it prints, and where, and with which exit code."""

import csv
import json
from pathlib import Path

import numpy as np
import pytest

import tracer
from tracer.__main__ import COMMANDS, main

RUN_FILE = """
title = "Command line"
body = { name = "Ball", radius = "1000 km", gm = "3000 km3 s-2" }
gas = { species = "He" }
surface = { sticking = 1.0 }
domain = { outer_radius = "20 radii" }
grid = { altitude = { cells = 5 }, latitude_cells = 4, local_time_cells = 6 }
ensemble = { particles_per_batch = 50, batches = 3 }
[[release]]
name = "vent"
rate = "1e20 s-1"
speed = { law = "maxwell-flux", temperature = "300 K" }
"""


@pytest.fixture
def folder(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("ball.toml").write_text(RUN_FILE, encoding="utf-8")
    return tmp_path


def exit_code(*words: str) -> int:
    with pytest.raises(SystemExit) as ended:
        main(words)
    return ended.value.code or 0


def test_overview_lists_every_command(capsys):
    assert exit_code("--help") == 0
    overview = capsys.readouterr().out
    assert all(entry.name in overview for entry in COMMANDS)


@pytest.mark.parametrize("entry", COMMANDS, ids=lambda entry: entry.name)
def test_every_command_explains_itself(entry, capsys):
    assert exit_code(entry.name, "--help") == 0
    assert "Usage: tracer " + entry.name in " ".join(capsys.readouterr().out.split())


def test_version_is_that_of_the_package(capsys):
    assert exit_code("--version") == 0
    assert capsys.readouterr().out == f"tracer {tracer.__version__}\n"


def test_unknown_command_ends_with_2(capsys):
    assert exit_code("trace") == 2
    assert "trace" in capsys.readouterr().err


def test_run_writes_a_product_and_prints_the_budget(folder, capsys):
    assert exit_code("run", "ball.toml") == 0
    shown = capsys.readouterr()
    assert "release 'vent': 1e+20 atoms per second" in shown.out
    assert "product: ball.nc" in shown.out
    assert "Next: tracer summary ball.nc" in shown.err
    with tracer.open_product("ball.nc") as ds:
        assert float(ds.ledger.sum()) == pytest.approx(1e20, rel=1e-9)
    assert sorted(path.name for path in folder.iterdir()) == ["ball.nc", "ball.toml"]


def test_existing_product_is_refused_before_tracing_and_left_whole(folder, capsys):
    Path("ball.nc").write_bytes(b"precious")
    assert exit_code("run", "ball.toml") == 2
    expected = "tracer: ball.nc: exists; --overwrite replaces it, or name another output\n"
    assert capsys.readouterr().err == expected
    assert Path("ball.nc").read_bytes() == b"precious"
    assert exit_code("run", "ball.toml", "--overwrite") == 0
    tracer.open_product("ball.nc").close()


def test_set_changes_the_run_and_is_recorded(folder):
    assert exit_code("run", "ball.toml", "-o", "two.nc", "--set", "release[1].rate=2e20 s-1") == 0
    with tracer.open_product("two.nc") as ds:
        assert float(ds.ledger.sum()) == pytest.approx(2e20, rel=1e-9)
        assert '"2e20 s-1"' in ds.attrs["run_file"]


def test_interrupted_run_ends_with_3_and_leaves_nothing(folder, monkeypatch, capsys):
    def interrupted(*_arguments, **_options):
        raise KeyboardInterrupt

    monkeypatch.setattr("tracer.commands.run.run", interrupted)
    assert exit_code("run", "ball.toml") == 3
    assert "interrupted" in capsys.readouterr().err
    assert [path.name for path in folder.iterdir()] == ["ball.toml"]


def test_bad_run_file_ends_with_2_and_one_line(folder, capsys):
    assert exit_code("check", "ball.toml", "--set", "release[1].speed.temprature=300 K") == 2
    shown = capsys.readouterr()
    assert shown.out == ""
    expected = "tracer: ball.toml: release[1].speed.temprature: unknown key; did you mean temperature?\n"
    assert shown.err == expected


def test_body_that_is_in_no_catalogue_is_told_what_it_needs(folder, capsys):
    assert exit_code("check", "ball.toml", "--set", 'body={name="Ball",radius="1000 km"}') == 2
    assert 'ball.toml: body.name: "Ball" is not in the catalogue (Mercury, ' in capsys.readouterr().err


def test_missing_outer_radius_is_asked_for(folder, capsys):
    assert exit_code("check", "ball.toml", "--set", "domain={}") == 2
    expected = (
        "tracer: ball.toml: domain.outer_radius: required for a body without an orbit, "
        'for example "40 radii"\n'
    )
    assert capsys.readouterr().err == expected


def test_check_prints_the_same_figures_for_people_and_machines(folder, capsys):
    assert exit_code("check", "ball.toml") == 0
    assert "jeans parameter" in capsys.readouterr().out
    assert exit_code("check", "ball.toml", "--json") == 0
    figures = json.loads(capsys.readouterr().out)
    # lambda = gm m/(kTR), values of the run file and k, u of CODATA 2022
    expected = 3e12 * 4.002602 * 1.66053906892e-27 / (1.380649e-23 * 300.0 * 1e6)
    assert figures["releases"][0]["jeans_parameter"] == pytest.approx(expected, rel=1e-12)
    assert figures["escape_speed"] == pytest.approx((2 * 3e12 / 1e6) ** 0.5, rel=1e-12)
    assert figures["releases"][0]["hop_time"] > 0.0


def test_new_writes_a_file_that_checks_and_refuses_to_replace_it(folder, capsys):
    assert exit_code("new", "mine") == 0
    assert exit_code("check", "mine.toml") == 0
    assert exit_code("new", "mine") == 2
    assert "mine.toml: exists already" in capsys.readouterr().err


def test_flight_writes_its_path_and_the_last_row_is_its_end(folder, capsys):
    words = [
        "--latitude",
        "10",
        "--local-time",
        "9",
        "--speed",
        "1 km/s",
        "--zenith-angle",
        "30",
        "--azimuth",
        "45",
    ]
    assert exit_code("flight", "ball.toml", *words, "-o", "path.csv", "--json") == 0
    summary = json.loads(capsys.readouterr().out)
    with open("path.csv", newline="", encoding="utf-8") as file:
        header, *rows = csv.reader(file)
    assert header == ["time", "survival", "lit", "x", "y", "z", "vx", "vy", "vz"]
    path = np.array(rows, dtype=float)
    assert path[-1, 0] == summary["flight_time"]
    # Landing on the sphere to 1e-9 radii is promised.
    assert np.linalg.norm(path[-1, 3:6]) == pytest.approx(1e6, rel=1e-9)
    assert np.linalg.norm(path[0, 6:9]) == pytest.approx(1000.0, rel=1e-12)
    assert summary["fate"] == "landed"
    assert summary["latitude"] == pytest.approx(np.degrees(np.arcsin(path[-1, 5] / 1e6)), rel=1e-9)


@pytest.mark.parametrize(
    ("option", "value", "message"),
    [
        ("--speed", "3", '--speed: "3" has no unit; write for example "2 km/s"'),
        ("--latitude", "91", "--latitude: 91.0 is out of range; must be -90 to 90 deg"),
        ("--zenith-angle", "nan", "--zenith-angle: nan is out of range; must be 0 to 90 deg"),
    ],
)
def test_flight_refuses_a_launch_that_is_none(folder, capsys, option, value, message):
    words = {
        "--latitude": "0",
        "--local-time": "9",
        "--speed": "1 km/s",
        "--zenith-angle": "3",
        "--azimuth": "4",
    }
    words[option] = value
    assert exit_code("flight", "ball.toml", *(word for pair in words.items() for word in pair)) == 2
    assert capsys.readouterr().err == f"tracer: {message}\n"


def test_summary_shows_the_budget_and_verifies_the_checksum(folder, capsys):
    assert exit_code("run", "ball.toml") == 0
    capsys.readouterr()
    assert exit_code("summary", "ball.nc", "--json") == 0
    figures = json.loads(capsys.readouterr().out)
    assert sum(figures["releases"]["vent"]["ledger"].values()) == pytest.approx(1e20, rel=1e-9)
    import netCDF4

    with netCDF4.Dataset("ball.nc", "a") as file:
        file["mean_life"][0] = 1.0
    assert exit_code("summary", "ball.nc") == 2
    assert "do not match its data_checksum" in capsys.readouterr().err


def test_summary_of_what_is_no_product_ends_with_2(folder, capsys):
    assert exit_code("summary", "ball.toml") == 2
    assert capsys.readouterr().err == "tracer: ball.toml: is not a netCDF-4 file\n"


def test_shares_are_made_and_merged_into_the_whole(folder, capsys):
    assert exit_code("run", "ball.toml", "-o", "whole.nc", "--set", "ensemble.batches=5") == 0
    assert exit_code("run", "ball.toml", "-o", "first.nc", "--batches", "0:2") == 0
    assert exit_code("run", "ball.toml", "-o", "second.nc", "--batches", "2:5") == 0
    capsys.readouterr()
    assert exit_code("merge", "second.nc", "first.nc", "-o", "merged.nc") == 0
    shown = capsys.readouterr()
    assert "5 batches of 2 products: seed 20310601 batches 0:5\n" in shown.out
    assert "5 replicates, put together in single precision\n" in shown.out
    assert "Next: tracer summary merged.nc" in shown.err
    with tracer.open_product("merged.nc") as merged, tracer.open_product("whole.nc") as whole:
        np.testing.assert_allclose(merged.number_density, whole.number_density, rtol=1e-12)
        errors = [ds.number_density_standard_error for ds in (merged, whole)]
        np.testing.assert_allclose(*errors, rtol=1e-6)
    assert exit_code("merge", "second.nc", "first.nc", "-o", "merged.nc") == 2
    assert "merged.nc: exists; --overwrite replaces it" in capsys.readouterr().err
    assert exit_code("merge", "first.nc", "first.nc", "-o", "again.nc") == 2
    assert "no batch counts twice" in capsys.readouterr().err
    assert not Path("again.nc").exists()


@pytest.mark.parametrize(
    ("share", "message"),
    [
        ("5", '"5" is no range; write for example 20:40 for the batches 20 to 39, counted from 0'),
        ("3:3", '"3:3" holds no batch; the first must be below the second'),
        ("-1:3", '"-1:3" is no range; write for example 20:40 for the batches 20 to 39, counted from 0'),
        ("0:1000000000000000", '"0:1000000000000000" is out of range; at most 15 digits'),
    ],
)
def test_a_share_that_is_none_is_refused(folder, capsys, share, message):
    assert exit_code("run", "ball.toml", f"--batches={share}") == 2
    assert capsys.readouterr().err == f"tracer: --batches: {message}\n"


def test_every_event_of_a_run_is_a_line_of_its_log(folder):
    assert exit_code("run", "ball.toml", "--log", "log.jsonl", "--set", STOP) == 0
    lines = [json.loads(line) for line in Path("log.jsonl").read_text(encoding="utf-8").splitlines()]
    assert [line["event"] for line in lines] == ["tracing", "traced", "written"]
    assert all(line["time"].endswith("+00:00") for line in lines)
    with tracer.open_product("ball.nc") as ds:
        assert lines[-1]["data_checksum"] == ds.attrs["data_checksum"]
        assert lines[1]["flights"] == ds.attrs["flights"]
    assert exit_code("run", "ball.toml", "-o", "b.nc", "--log", "nowhere/log.jsonl") == 2


STOP = 'ensemble.stop={ variable="number_density", relative_error=0.9, at_most_batches=40 }'


def test_a_run_until_good_enough_says_whether_it_was_reached(folder, capsys):
    assert exit_code("run", "ball.toml", "--set", STOP) == 0
    assert (
        "relative error asked for: reached after 20 batches, the region's mean known to "
        in capsys.readouterr().out
    )
    assert exit_code("check", "ball.toml", "--set", STOP) == 0
    assert "at most 2,000 in at most 40 batches" in capsys.readouterr().out
