"""Tables of the user's: speeds and g."""

import pytest

from tracer.engine.speed_table import read_speed_table
from tracer.engine.two_columns import read_two_columns
from tracer.errors import InputError


def test_heading_and_comments_are_passed_over(tmp_path):
    path = tmp_path / "speed.csv"
    path.write_text("# invented\nspeed (m/s),pdf\n0,0\n500,2\n1000,0\n", encoding="utf-8")
    speed, pdf = read_speed_table(path)
    assert speed.tolist() == [0.0, 500.0, 1000.0]
    assert pdf.tolist() == [0.0, 2.0, 0.0]


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (
            "km/s,pdf\n0,0\n1,1\n",
            "line 1: the heading 'km/s,pdf' names another unit; the first column is in m/s",
        ),
        ("0,0\n500,x\n", "line 2: '500,x' is not two numbers: speed in m/s, pdf"),
        ("0,0\n500,1\n400,1\n", "line 3: 400 does not rise above 500"),
        ("-1,0\n500,1\n", "line 1: speed -1 must be at least 0 m/s"),
        ("0,0\n500,0\n", "has no flux: the pdf is 0 everywhere"),
        ("0,1e308\n1e308,1e308\n", "its speeds or pdf are too large to be summed"),
        ("0,0\n", "has 1 rows of numbers; at least 2 are needed"),
    ],
)
def test_speed_table_that_is_none_is_refused(tmp_path, content, message):
    path = tmp_path / "speed.csv"
    path.write_text(content, encoding="utf-8")
    with pytest.raises(InputError) as refused:
        read_speed_table(path)
    assert str(refused.value) == message


@pytest.mark.parametrize("heading", ["radial_velocity_km_s,g", "v [km/s], g", "velocity,g"])
def test_headings_in_kilometres_are_those_of_g(tmp_path, heading):
    path = tmp_path / "g.csv"
    path.write_text(f"{heading}\n-20,1\n20,2\n", encoding="utf-8")
    assert len(read_two_columns(path, "radial velocity in km/s, g in 1/s", "km/s")) == 2


@pytest.mark.parametrize("heading", ["v [m/s], g", "velocity_m_s,g"])
def test_headings_in_metres_are_refused_for_g(tmp_path, heading):
    path = tmp_path / "g.csv"
    path.write_text(f"{heading}\n-20,1\n20,2\n", encoding="utf-8")
    with pytest.raises(InputError, match="names another unit"):
        read_two_columns(path, "radial velocity in km/s, g in 1/s", "km/s")


def test_file_with_an_endless_cell_is_refused(tmp_path):
    path = tmp_path / "speed.csv"
    path.write_text("9" * 200_000 + ",1\n1,1\n", encoding="utf-8")
    with pytest.raises(InputError, match="cannot be read: field larger"):
        read_speed_table(path)
