"""`tracer sightlines` as people use it."""

import csv
import io

import numpy as np
import pytest
import xarray as xr
from astropy.table import Table

from tracer.__main__ import main
from tracer.observe.sightlines import sightlines
from tracer.product.writing import save_product

RAYS = """time,observer_x_km,observer_y_km,observer_z_km,look_x,look_y,look_z,what
0,9000,0,2500,-1,0,0,over the pole
10,0,9000,0,0,-1,0.1,from dusk
20,3000,0,0,1,0,0,to the Sun
"""
ASKED = [
    "tangent_altitude_km",
    "tangent_latitude_deg",
    "tangent_local_time_h",
    "solar_zenith_angle_deg",
    "sun_angle_deg",
    "ends_at_body",
    "column_m2",
    "column_standard_error_m2",
    "column_lit_m2",
    "brightness_na_d2_rayleigh",
    "brightness_na_d2_standard_error_rayleigh",
    "brightness_na_d1_rayleigh",
    "brightness_na_d1_standard_error_rayleigh",
    "brightness_invented_rayleigh",
    "brightness_invented_standard_error_rayleigh",
    "optical_depth_na_d2",
    "optical_depth_na_d1",
    "optical_depth_invented",
    "thick",
    "outside_share",
]


@pytest.fixture
def folder(tmp_path, monkeypatch, small_light_product):
    monkeypatch.chdir(tmp_path)
    save_product(small_light_product, "small.nc")
    (tmp_path / "rays.csv").write_text(RAYS, encoding="utf-8")
    return tmp_path


def ending_of(*words: str) -> int:
    with pytest.raises(SystemExit) as ended:
        main(["sightlines", *words])
    return ended.value.code or 0


def test_every_kind_of_table_holds_the_same(folder, capsys, small_light_product):
    expected = sightlines(small_light_product, Table.read(RAYS, format="ascii.csv"))
    assert expected.colnames == [*RAYS.split("\n", 1)[0].split(","), *ASKED]
    for name in ("out.csv", "out.ecsv", "out.nc"):
        assert ending_of("small.nc", "rays.csv", "-o", name) == 0
        shown = capsys.readouterr()
        assert shown.out == f"{name}\n"
        assert "flight rules" in shown.err
        assert shown.err.endswith("Next: tracer plan small.nc PLAN.toml\n")
    plain, rich = Table.read("out.csv", format="ascii.csv"), Table.read("out.ecsv", format="ascii.ecsv")
    assert str(rich["brightness_na_d2_rayleigh"].unit) == "R"
    assert str(rich["column_m2"].unit) == "1 / m2"
    assert "flight rules" in rich.meta["caution"]
    with xr.open_dataset("out.nc") as ds:
        assert ds["column_m2"].attrs["units"] == "m-2"
        assert ds["brightness_na_d2_rayleigh"].attrs["units"] == "1e10 m-2 s-1"
        for name in expected.colnames:
            for values in (plain[name], rich[name], ds[name].values):
                if expected[name].dtype.kind == "f":
                    np.testing.assert_array_equal(np.ma.filled(np.ma.asarray(values), np.nan), expected[name])
                else:
                    assert [str(value).lower() for value in values] in (
                        [str(value).lower() for value in expected[name]],
                        [str(int(value)) for value in expected[name]] if name != "what" else None,
                    )
    assert sorted(path.name for path in folder.iterdir()) == sorted(
        ["small.nc", "rays.csv", "out.csv", "out.ecsv", "out.nc"]
    )


def test_without_an_output_the_table_goes_to_standard_output(folder, capsys):
    assert ending_of("small.nc", "rays.csv", "--line", "na_d1", "--by-release", "--no-errors") == 0
    rows = list(csv.DictReader(io.StringIO(capsys.readouterr().out)))
    assert [row["what"] for row in rows] == ["over the pole", "from dusk", "to the Sun"]
    for row in rows:
        parts = [float(row[f"column_m2_{release}"]) for release in ("impact_vapour", "sputtering")]
        assert float(row["column_m2"]) == pytest.approx(sum(parts))
    assert "brightness_na_d1_rayleigh_sputtering" in rows[0]
    assert not any("na_d2" in name or "standard_error" in name for name in rows[0])


def test_rays_come_from_ecsv_in_other_units_too(folder, capsys):
    table = Table.read(RAYS, format="ascii.csv")
    for name in ("observer_x_km", "observer_y_km", "observer_z_km"):
        table[name] = 1e3 * table[name]
        table[name].unit = "m"
    table.write("rays.ecsv", format="ascii.ecsv")
    columns = []
    for name in ("rays.csv", "rays.ecsv"):
        assert ending_of("small.nc", name) == 0
        columns.append([row["column_m2"] for row in csv.DictReader(io.StringIO(capsys.readouterr().out))])
    np.testing.assert_allclose(np.array(columns[0], float), np.array(columns[1], float), rtol=1e-12)


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (["small.nc", "none.csv"], "none.csv: no such file"),
        (["small.nc", "small.nc"], "small.nc: has none of the endings of a table: .csv, .ecsv"),
        (["none.nc", "rays.csv"], "none.nc: no such file"),
        (
            ["small.nc", "rays.csv", "-o", "out.txt"],
            '--output: "out.txt" has none of the endings of a table: .csv, .ecsv, .nc',
        ),
        (
            ["small.nc", "rays.csv", "-o", "rays.csv", "--overwrite"],
            "rays.csv: is read by this command; name another output",
        ),
        (
            ["small.nc", "rays.csv", "--line", "na_d3"],
            'small.nc: there is no line "na_d3"; allowed: "na_d2", "na_d1", "invented"',
        ),
        (
            ["small.nc", "rays.csv", "--doppler-speed", "1200 K"],
            '--doppler-speed: "1200 K": "K" is not a unit of speed; write for example "2 km/s"',
        ),
        (
            ["small.nc", "rays.csv", "--doppler-speed", "0 m/s"],
            '--doppler-speed: "0 m/s" is out of range; must be above 0 m s-1',
        ),
    ],
)
def test_bad_words_end_with_2_one_line_and_no_file(folder, capsys, words, message):
    before = sorted(path.name for path in folder.iterdir())
    assert ending_of(*words) == 2
    assert capsys.readouterr().err == f"tracer: {message}\n"
    assert sorted(path.name for path in folder.iterdir()) == before


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            "10,0,9000",
            "10,nan,9000",
            "rays.csv: row 2, column observer_x_km: nan is not allowed; must be a finite",
        ),
        ("10,0,9000", "10,,9000", "rays.csv: row 2, column observer_x_km: missing; must be a finite number"),
        ("10,0,9000", "10,x,9000", 'rays.csv: row 2, column observer_x_km: "x" is not a number'),
        ("10,0,9000", "-1,0,9000", "rays.csv: row 2, column time: -1 is earlier than 0 in row 1"),
        (
            "1,0,0,to",
            "0,0,0,to",
            "rays.csv: row 3, columns look_x, look_y, look_z: the look vector has no length",
        ),
        ("observer_z_km", "z", "rays.csv: column observer_z_km: missing; the table has time, observer_x_km"),
        (
            "20,3000,0",
            "20,30,0",
            "rays.csv: row 3, columns observer_x_km, observer_y_km, observer_z_km: the observer",
        ),
    ],
)
def test_bad_table_ends_with_2_row_and_column(folder, capsys, old, new, message):
    (folder / "rays.csv").write_text(RAYS.replace(old, new), encoding="utf-8")
    assert ending_of("small.nc", "rays.csv", "-o", "out.csv") == 2
    assert capsys.readouterr().err.startswith(f"tracer: {message}")
    assert not (folder / "out.csv").exists()


def test_columns_that_stand_there_twice_are_refused_and_comments_are_not(folder, capsys):
    twice = RAYS.replace(",what", ",look_x").replace("over the pole", "1").replace("from dusk", "2")
    (folder / "rays.csv").write_text(twice.replace("to the Sun", "3"), encoding="utf-8")
    assert ending_of("small.nc", "rays.csv") == 2
    assert capsys.readouterr().err == "tracer: rays.csv: column look_x: stands there twice\n"
    (folder / "rays.csv").write_text("# seen by nobody\n" + RAYS.replace(",", ", "), encoding="utf-8")
    assert ending_of("small.nc", "rays.csv") == 0
    assert len(capsys.readouterr().out.splitlines()) == 4


def test_damaged_product_is_one_message(folder, capsys):
    content = bytearray((folder / "small.nc").read_bytes())
    content[len(content) // 3 : len(content) // 3 * 2] = bytes(len(content) // 3)
    (folder / "small.nc").write_bytes(content)
    assert ending_of("small.nc", "rays.csv") == 2
    assert capsys.readouterr().err.startswith("tracer: small.nc: is damaged")


@pytest.mark.parametrize(
    "text", ["", "a,b\n", "\x00\x01", "observer_x_km,look_x\n1,2,3\n", "a\n1\n", '"\n', ",\n,\n"]
)
def test_what_is_no_table_of_rays_ends_with_2(folder, capsys, text):
    (folder / "rays.csv").write_text(text, encoding="utf-8")
    assert ending_of("small.nc", "rays.csv") == 2
    error = capsys.readouterr().err
    assert error.startswith("tracer: rays.csv: ")
    assert error.count("\n") == 1


def test_existing_table_is_kept(folder, capsys):
    (folder / "out.csv").write_text("precious", encoding="utf-8")
    assert ending_of("small.nc", "rays.csv", "-o", "out.csv") == 2
    assert "exists; --overwrite replaces it" in capsys.readouterr().err
    assert (folder / "out.csv").read_text(encoding="utf-8") == "precious"
    assert ending_of("small.nc", "rays.csv", "-o", "out.csv", "--overwrite") == 0


def test_dates_are_times(folder, capsys):
    dated = RAYS
    for number, text in (
        ("0,9000", "2031-06-01T00:00:00"),
        ("10,0", "2031-06-01T00:00:10"),
        ("20,3", "2031-05-31"),
    ):
        dated = dated.replace(f"\n{number}", f"\n{text},{number.split(',')[1]}")
    (folder / "rays.csv").write_text(dated, encoding="utf-8")
    assert ending_of("small.nc", "rays.csv") == 2
    assert "row 3, column time: 2031-05-31 is earlier than 2031-06-01T00:00:10" in capsys.readouterr().err
