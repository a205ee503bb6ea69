"""`tracer sweep` in process, and what the other commands do with a sweep's product."""

import json
import shutil
from pathlib import Path

import netCDF4
import pytest

import tracer
from tracer.__main__ import main

SWEEP = """
title = "Sodium over Harrow, swept"
[sweep]
run = "small.toml"
[[sweep.axis]]
key = "sun.distance"
first = "0.35 au"
last = "0.45 au"
count = 2
[[sweep.axis]]
key = "surface.sticking"
values = [0.2, 0.5, 1.0]
[ensemble]
particles_per_batch = 100
"""


def ending_of(*words: str) -> int:
    with pytest.raises(SystemExit) as ended:
        main(words)
    return ended.value.code or 0


@pytest.fixture(scope="module")
def made(tmp_path_factory, small_light_run_file):
    """Return a folder with a sweep file and its product; not to be changed."""
    folder = tmp_path_factory.mktemp("swept")
    shutil.copy(small_light_run_file, folder / "small.toml")
    (folder / "sweep.toml").write_text(SWEEP, encoding="utf-8")
    tracer.run_sweep(tracer.load_sweep(folder / "sweep.toml"), folder / "swept.nc", workers=1)
    return folder


@pytest.fixture
def folder(made, tmp_path, monkeypatch):
    for name in ("small.toml", "sweep.toml", "swept.nc"):
        shutil.copy(made / name, tmp_path)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_sweep_writes_one_product_and_prints_what_becomes_of_the_atoms(folder, capsys):
    assert ending_of("sweep", "sweep.toml", "--workers", "1") == 0
    shown = capsys.readouterr()
    head, _, first, *_ = shown.out.splitlines()
    assert (
        head.split() == ["point", "distance", "sticking", "captured", "%", "escaped", "%", "ionized", "%"]
        or "%" in head
    )
    assert first.split()[:4] == ["1", "0.35", "au", "0.2"]
    assert "product: sweep.nc" in shown.out
    assert "point 6 of 6: distance 0.45 au, sticking 1.0" in shown.err
    assert "Next: tracer plot sweep.nc --what swept-ledger" in shown.err
    with tracer.open_sweep("sweep.nc") as one, tracer.open_sweep("swept.nc") as other:
        assert one.attrs["sweep_hash"] == other.attrs["sweep_hash"]
        assert (one.ledger == other.ledger).all()
    assert not Path(".sweep.nc.points").exists()


def test_settings_change_the_run_of_all_points(folder):
    assert (
        ending_of("sweep", "sweep.toml", "--workers", "1", "--set", "ensemble.batches=2", "-o", "two.nc") == 0
    )
    with tracer.open_sweep("two.nc") as ds:
        assert set(ds.point_batches.values.ravel()) == {2.0}


def test_check_prints_all_points_and_traces_nothing(folder, capsys):
    assert ending_of("sweep", "sweep.toml", "--check") == 0
    shown = capsys.readouterr()
    assert [line.split()[:4] for line in shown.out.splitlines()[3:5]] == [
        ["1", "0.35", "au", "0.2"],
        ["2", "0.35", "au", "0.5"],
    ]
    assert "6, one after the other" in shown.out
    assert "Next: tracer sweep sweep.toml" in shown.err
    assert not Path("sweep.nc").exists()


def test_check_prints_for_machines(folder, capsys):
    assert ending_of("sweep", "sweep.toml", "--check", "--json") == 0
    figures = json.loads(capsys.readouterr().out)
    assert figures["points"][4]["settings"] == ["sun.distance=0.45 au", "surface.sticking=0.5"]
    assert figures["particles"] == 6 * 6 * 2 * 100
    assert ending_of("sweep", "sweep.toml", "--json") == 2


def test_a_point_is_the_same_traced_alone_taken_out_or_run_by_its_settings(folder):
    assert ending_of("sweep", "sweep.toml", "--point", "5", "-o", "traced.nc", "--workers", "1") == 0
    assert ending_of("sweep", "swept.nc", "--point", "5", "-o", "taken.nc") == 0
    changes = ("sun.distance=0.45 au", "surface.sticking=0.5", "ensemble.particles_per_batch=100")
    words = [word for change in changes for word in ("--set", change)]
    assert ending_of("run", "small.toml", "-o", "run.nc", *words) == 0
    sums = []
    for name in ("traced.nc", "taken.nc", "run.nc"):
        with tracer.open_product(name) as ds:
            sums.append((ds.attrs["data_checksum"], ds.attrs["run_hash"]))
    assert len(set(sums)) == 1


def test_default_names_of_points_say_which_they_are(folder):
    assert ending_of("sweep", "swept.nc", "--point", "2") == 0
    tracer.open_product("swept-point-2.nc").close()
    assert ending_of("sweep", "swept.nc", "--point", "2") == 2


def test_resuming_a_complete_sweep_says_so(folder, capsys):
    before = Path("swept.nc").read_bytes()
    assert ending_of("sweep", "sweep.toml", "-o", "swept.nc", "--resume") == 0
    assert capsys.readouterr().out == "product: swept.nc is complete already: nothing to do\n"
    assert ending_of("sweep", "sweep.toml", "-o", "swept.nc") == 2
    assert Path("swept.nc").read_bytes() == before


def test_summary_says_what_a_sweep_holds_and_notices_damage(folder, capsys):
    assert ending_of("summary", "swept.nc") == 0
    shown = capsys.readouterr()
    assert "distance sticking" in shown.out
    assert "distance x sticking x release x fate" in shown.out
    assert "Next: tracer sweep swept.nc --point 1" in shown.err
    assert ending_of("summary", "swept.nc", "--json") == 0
    figures = json.loads(capsys.readouterr().out)
    assert figures["swept"]["values"]["sticking"] == [0.2, 0.5, 1.0]
    shutil.copy("swept.nc", "bad.nc")
    with netCDF4.Dataset("bad.nc", "a") as file:
        file.variables["ledger"][0, 0, 0, 0] *= 2.0
    assert ending_of("summary", "bad.nc") == 2


@pytest.mark.parametrize(
    "words",
    [
        ("--what", "swept-ledger"),
        ("--what", "swept-ledger", "--fate", "ionized", "--release", "sputtering"),
        ("--what", "swept-column", "--width", "column"),
        ("--what", "swept-column", "--place", "0,12"),
        ("--what", "swept-brightness", "--line", "na_d2"),
        ("--what", "swept-brightness", "--sky", "-2,0.5"),
        ("--what", "swept-tail", "--level", "1e8"),
    ],
)
def test_figures_of_a_sweep_are_drawn(folder, capsys, words):
    assert ending_of("plot", "swept.nc", *words, "--dpi", "50", "-o", "a.png") == 0
    shown = capsys.readouterr()
    assert shown.out == "a.png\n"
    assert "Next: tracer sweep swept.nc --point 1" in shown.err


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (
            ("sweep", "small.toml"),
            "small.toml: sweep: missing; a sweep file is a run file with a table [sweep]",
        ),
        (("sweep", "none.toml"), "none.toml: no such file"),
        (
            ("sweep", "swept.nc"),
            "swept.nc: is a product, not a sweep file; --point N takes one point out of it",
        ),
        (("sweep", "swept.nc", "--point", "7"), "swept.nc: there is no point 7; there are 6, counted from 1"),
        (
            ("sweep", "sweep.toml", "--point", "7"),
            "--point: there is no point 7; there are 6, counted from 1",
        ),
        (
            ("sweep", "swept.nc", "--point", "2", "--check"),
            "--point: cannot go with --check, which is about all points of a sweep",
        ),
        (
            ("sweep", "sweep.toml", "--point", "2", "--resume"),
            "--point: cannot go with --resume, which is about all points of a sweep",
        ),
        (
            ("sweep", "swept.nc", "--point", "2", "--set", "ensemble.seed=3"),
            "swept.nc: is a product, which is traced already; --set goes with a sweep file",
        ),
        (
            ("sweep", "sweep.toml", "-o", "small.toml"),
            "small.toml: is read by this command; name another output",
        ),
        (("sweep", "sweep.toml", "-o", "none/a.nc"), "none/a.nc: there is no folder "),
        (
            ("sweep", "sweep.toml", "--workers", "2", "--cluster", "local:1"),
            "--workers: is for threads; the workers of a --cluster are its own",
        ),
        (
            ("run", "sweep.toml"),
            "sweep.toml: sweep: makes this a sweep file, not a run file; tracer sweep traces it",
        ),
        (("check", "sweep.toml"), "sweep.toml: sweep: makes this a sweep file, not a run file; "),
        (("report", "swept.nc"), "swept.nc: is the product of a sweep, not of a run; "),
        (
            ("merge", "swept.nc", "swept.nc", "-o", "m.nc"),
            "swept.nc: is the product of a sweep, not of a run; ",
        ),
        (
            ("plot", "swept.nc", "--what", "density", "-o", "a.png"),
            "--what: density is a figure of a run, and swept.nc is a sweep's, which has swept-ledger, ",
        ),
        (
            ("plot", "swept.nc", "--what", "swept-tail", "-o", "a.png"),
            "swept.nc: --level is needed, in cm-2: how bright a tail counts; the tails show ",
        ),
        (
            ("plot", "swept.nc", "--what", "swept-tail", "--level", "-1", "-o", "a.png"),
            "--level: -1 is out of range; must be above 0",
        ),
        (
            ("plot", "swept.nc", "--what", "swept-column", "--place", "12", "-o", "a.png"),
            '--place: "12" is not two numbers; write for example 0,12',
        ),
        (
            ("plot", "swept.nc", "--what", "swept-column", "--fate", "escaped", "-o", "a.png"),
            "--fate: goes with --what swept-ledger, not with --what swept-column",
        ),
    ],
)
def test_bad_input_ends_with_2_and_one_line(folder, capsys, words, message):
    assert ending_of(*words) == 2
    shown = capsys.readouterr()
    assert shown.err.splitlines()[-1].startswith(f"tracer: {message}")
    assert sorted(path.name for path in folder.iterdir()) == ["small.toml", "sweep.toml", "swept.nc"]


def test_figures_of_sweeps_need_a_sweep(folder, capsys):
    assert ending_of("sweep", "swept.nc", "--point", "1", "-o", "one.nc") == 0
    assert ending_of("plot", "one.nc", "--what", "swept-ledger", "-o", "a.png") == 2
    assert "one.nc: is the product of a run, not of a sweep" in capsys.readouterr().err


# The checker takes its time for every variable: words and numbers as axes, no images and no replicates.
FEW = """
image = []
[sweep]
run = "small.toml"
combine = "paired"
[[sweep.axis]]
key = "surface.temperature"
name = "ground"
values = [{ law = "uniform", value = "300 K" }, { law = "uniform", value = "100 K" }]
labels = ["warm", "cold"]
[[sweep.axis]]
key = "domain.age_limit"
values = ["30 d", "40 d"]
[ensemble]
replicates = 0
"""


def test_product_follows_the_cf_conventions(small_run_file, tmp_path, check_conventions):
    shutil.copy(small_run_file, tmp_path / "small.toml")
    (tmp_path / "few.toml").write_text(FEW, encoding="utf-8")
    tracer.run_sweep(tracer.load_sweep(tmp_path / "few.toml"), tmp_path / "few.nc", workers=1)
    done = check_conventions(tmp_path / "few.nc")
    assert done.returncode == 0, done.stdout
    assert "All tests passed!" in done.stdout
