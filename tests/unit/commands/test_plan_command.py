"""`tracer plan` as people use it, and the demo of the orbiter Lantern at Harrow."""

import csv
import io
import shutil
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from astropy.table import Table

import tracer
from tracer.__main__ import main
from tracer.product.writing import save_product

RUNS = Path(__file__).parents[3] / "runs"
DEMO = ("lantern-plan.toml", "lantern-path.csv", "lantern-scattered-sunlight.csv")


@pytest.fixture
def folder(tmp_path, monkeypatch, small_light_product):
    monkeypatch.chdir(tmp_path)
    save_product(small_light_product, "small.nc")
    for name in DEMO:
        shutil.copy(RUNS / name, name)
    return tmp_path


def ending_of(*words: str) -> int:
    with pytest.raises(SystemExit) as ended:
        main(["plan", *words])
    return ended.value.code or 0


def test_demo_gives_a_row_for_each_exposure_and_marks_the_sun(folder, capsys):
    for name in ("out.csv", "out.ecsv", "out.nc"):
        assert ending_of("small.nc", "lantern-plan.toml", "-o", name) == 0
        shown = capsys.readouterr()
        assert shown.out.startswith("91 exposures: ")
        assert "flight rules" in shown.out
        assert "not to be commanded" in shown.out
        assert shown.out.endswith(f"{name}\n")
        assert shown.err.startswith("Next: tracer ")
    table, plain = Table.read("out.ecsv", format="ascii.ecsv"), Table.read("out.csv", format="ascii.csv")
    assert len(table) == len(plain) == 91
    keep_out = np.asarray(table["sun_keep_out"])
    assert 0 < keep_out.sum() < 20
    marked = [str(words).startswith("NOT to be commanded") for words in table["command"]]
    np.testing.assert_array_equal(marked, keep_out)
    assert np.all(np.asarray(table["sun_angle_deg"])[~keep_out] > 35.0)
    assert "must not be commanded" in table.meta["caution"]
    with xr.open_dataset("out.nc", decode_times=False) as ds:
        np.testing.assert_array_equal(ds["snr"].values, table["snr"])
        assert ds.sizes == {"exposure": 91}
        assert "flight rules" in ds.attrs["caution"]
    assert not [path for path in folder.iterdir() if path.name.startswith(".")]


def test_without_an_output_the_table_goes_to_standard_output(folder, capsys):
    assert ending_of("small.nc", "lantern-plan.toml") == 0
    shown = capsys.readouterr()
    assert len(list(csv.DictReader(io.StringIO(shown.out)))) == 91
    assert "best windows" in shown.err
    assert "flight rules" in shown.err


def test_bad_inputs_end_with_2_one_line_and_no_file(folder, capsys):
    before = sorted(path.name for path in folder.iterdir())
    path = folder / "lantern-path.csv"
    for words, message in (
        (["small.nc", "none.toml", "-o", "a.csv"], "none.toml: no such file"),
        (["none.nc", "lantern-plan.toml", "-o", "a.csv"], "none.nc: no such file"),
        (["small.nc", "lantern-plan.toml", "-o", "a.txt"], '--output: "a.txt" has none of the endings'),
        (
            ["small.nc", "lantern-plan.toml", "-o", str(path), "--overwrite"],
            f"{path}: is read by this command",
        ),
        (["small.nc", "lantern-path.csv"], "lantern-path.csv: line 1"),
    ):
        assert ending_of(*words) == 2
        error = capsys.readouterr().err
        assert error.startswith(f"tracer: {message}"), error
        assert error.count("\n") == 1
        assert sorted(path.name for path in folder.iterdir()) == before


def test_existing_table_is_kept(folder, capsys):
    (folder / "out.csv").write_text("precious", encoding="utf-8")
    assert ending_of("small.nc", "lantern-plan.toml", "-o", "out.csv") == 2
    assert "exists; --overwrite replaces it" in capsys.readouterr().err
    assert (folder / "out.csv").read_text(encoding="utf-8") == "precious"


def test_netcdf_table_follows_the_cf_conventions(folder, check_conventions):
    assert ending_of("small.nc", "lantern-plan.toml", "-o", "out.nc") == 0
    done = check_conventions("out.nc")
    assert done.returncode == 0, done.stdout
    assert "All tests passed!" in done.stdout


def test_overlapping_exposures_get_a_word(folder, capsys):
    text = (folder / "lantern-plan.toml").read_text(encoding="utf-8")
    (folder / "lantern-plan.toml").write_text(text.replace('"2 s"', '"5 min"'), encoding="utf-8")
    assert ending_of("small.nc", "lantern-plan.toml", "-o", "out.csv") == 0
    assert "exposures of 300 s overlap: rows are as little as 240 s apart" in capsys.readouterr().out


def test_product_far_from_where_the_path_is_gets_a_word(folder, capsys):
    lines = (folder / "lantern-path.csv").read_text(encoding="utf-8").splitlines()
    rows = [lines[0] + ",sun_x_km,sun_y_km,sun_z_km", *(line + ",6e7,0,0" for line in lines[1:])]
    (folder / "lantern-path.csv").write_text("\n".join(rows), encoding="utf-8")
    text = (folder / "lantern-plan.toml").read_text(encoding="utf-8")
    inertial = (
        'file = "lantern-path.csv"\nframe = "inertial"\ninertial_frame = "ICRF"\norbit_normal = [0, 0, 1]\n#'
    )
    (folder / "lantern-plan.toml").write_text(
        text.replace('file = "lantern-path.csv"', inertial), encoding="utf-8"
    )
    assert ending_of("small.nc", "lantern-plan.toml", "-o", "out.csv") == 0
    assert (
        "the product is for 0.35 au from the Sun, the path runs from 0.4011 to 0.4011 au"
        in capsys.readouterr().out
    )


def test_functions_are_there_for_notebooks(small_light_product):
    table = tracer.plan_observation(small_light_product, tracer.load_plan(RUNS / "lantern-plan.toml"))
    rays = {name: table[name] for name in table.colnames if name.startswith(("observer_", "look_"))}
    assert len(tracer.sightlines(small_light_product, rays)) == len(table)


def test_commands_load_neither_the_engine_nor_figures():
    code = (
        "import sys, tracer.commands.plan, tracer.commands.sightlines; "
        "print([name for name in ('matplotlib.pyplot', 'tracer.engine', 'spiceypy') if name in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "[]\n"
