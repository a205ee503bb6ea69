"""Plans read back and drawn in time."""

import numpy as np
import pytest
import xarray as xr
from astropy.table import Table

from tracer.errors import InputError
from tracer.plots.plan_table import FORBIDDEN, read_plan
from tracer.plots.timeline import timeline


def test_what_must_not_be_commanded_is_shaded_through_every_panel(make_plan):
    figure = timeline(read_plan(make_plan(rows=6, forbidden=(4, 5))))
    for axes in figure.axes:
        (shade,) = [patch for patch in axes.patches if patch.get_gid() == FORBIDDEN]
        # From halfway between the fourth and fifth minute to half a minute beyond the last, 1 d = 1440 min.
        start = 1440.0 * (shade.get_x() - axes.lines[0].get_xdata()[0]) if axes.lines else 3.5
        assert start == pytest.approx(3.5, abs=1e-3)
        assert 1440.0 * shade.get_width() == pytest.approx(2.0, abs=1e-3)
    texts = " ".join(text.get_text() for text in figure.texts)
    assert "2 marked as not to be commanded" in texts
    assert "flight rules" in texts


def test_flags_without_a_row_are_left_out(make_plan):
    labels = [text.get_text() for text in timeline(read_plan(make_plan())).axes[-1].get_yticklabels()]
    assert labels == ["not to be commanded", "Sun inside keep-out", "saturated"]


def test_brightness_is_in_kilorayleigh(make_plan):
    axes = timeline(read_plan(make_plan(rows=3))).axes[0]
    np.testing.assert_allclose(axes.lines[0].get_ydata(), [200.0, 400.0, 600.0])


def test_csv_ecsv_and_netcdf_tell_the_same(make_plan, tmp_path):
    plain = read_plan(make_plan())
    table = Table(dict(plain.columns), meta={"title": "Scan"})
    table.write(tmp_path / "plan.ecsv", format="ascii.ecsv", delimiter=",")
    columns = {
        name: ("exposure", values.astype("i1") if values.dtype.kind == "b" else values)
        for name, values in plain.columns.items()
    }
    xr.Dataset(columns, attrs={"title": "Scan"}).to_netcdf(tmp_path / "plan.nc")
    for ending in ("ecsv", "nc"):
        other = read_plan(tmp_path / f"plan.{ending}")
        assert other.notes["title"] == "Scan"
        assert other.lines == plain.lines == ["na_d2"]
        for name, values in plain.columns.items():
            np.testing.assert_array_equal(other.columns[name], values)


@pytest.mark.parametrize(
    ("name", "text", "message"),
    [
        ("plan.txt", "time\n", "has none of the endings of a plan: .csv, .ecsv, .nc"),
        ("plan.csv", "time,snr\n1,2\n", "is no result of tracer plan: it has no column do_not_command"),
        ("plan.csv", "time,snr,do_not_command\n", "has no rows"),
        ("plan.ecsv", "\x00", "cannot be read as a table"),
        ("plan.nc", "no netCDF", "cannot be read as a table"),
    ],
)
def test_what_is_no_plan_is_refused(tmp_path, name, text, message):
    path = tmp_path / name
    path.write_text(text, encoding="utf-8")
    with pytest.raises(InputError) as refusal:
        read_plan(path)
    assert message in str(refusal.value)
    assert str(refusal.value).startswith(str(path))
