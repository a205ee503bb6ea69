"""Tables that come in with entries missing go out without inventions, whatever the file."""

import netCDF4
import numpy as np
import pytest

from tracer.errors import InputError
from tracer.observe.table_files import table_bytes
from tracer.observe.tables import column_values, read_table


@pytest.fixture
def table(tmp_path):
    path = tmp_path / "rays.csv"
    path.write_text("orbit,label\n,a\n3,\n", encoding="utf-8")
    return read_table(path)


def test_a_missing_number_is_no_number_and_a_missing_text_is_empty(table):
    assert np.array_equal(column_values(table["orbit"]), [np.nan, 3.0], equal_nan=True)
    assert list(column_values(table["label"])) == ["a", ""]


@pytest.mark.parametrize("ending", [".csv", ".ecsv"])
def test_what_was_missing_is_missing_in_a_written_table(table, ending):
    rows = table_bytes(table, ending, "ray").decode().splitlines()[-2:]
    assert "999999" not in "".join(rows)
    assert rows[0].endswith(",a")
    assert rows[1] in ("3,", "3.0,", '3,""', '3.0,""')


def test_columns_that_would_have_one_name_in_netcdf_are_refused(tmp_path):
    path = tmp_path / "rays.csv"
    path.write_text("a-b,a_b\n1,2\n", encoding="utf-8")
    with pytest.raises(InputError, match="columns a-b and a_b: have one name, a_b, in netCDF; rename one"):
        table_bytes(read_table(path), ".nc", "ray")


def test_times_are_seconds_in_netcdf(tmp_path):
    path = tmp_path / "rays.csv"
    path.write_text("time\n1.5\n2.5\n", encoding="utf-8")
    (tmp_path / "rays.nc").write_bytes(table_bytes(read_table(path), ".nc", "ray"))
    with netCDF4.Dataset(tmp_path / "rays.nc") as file:
        assert file["time"].units == "s"
