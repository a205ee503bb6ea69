"""g-values from the catalogue's tables and the user's."""

import numpy as np
import pytest

from tracer.catalogue.lines import lines
from tracer.kernels.lines import line_value, sum_of_lines
from tracer.physics.lines import (
    catalogue_table,
    constant_table,
    line_acceleration,
    line_tables,
    push_tables,
    table_of,
    table_value,
)


def table(name):
    found = catalogue_table(lines()[name])
    assert found is not None
    return found


def test_residual_flux_goes_before_a_g_table():
    line = lines()["na_d1"]
    assert line.residual_flux is not None
    assert line.g is not None
    velocity = line.velocity_of_offset(-0.20e-10)
    # Continuum g 5.42 s-1 times the residual flux at -0.20 angstrom, both from the data files.
    flux = dict(
        zip(np.round(np.array(line.residual_flux.offset) * 1e10, 2), line.residual_flux.flux, strict=True)
    )
    assert table_value(table("na_d1"), velocity) == pytest.approx(5.42 * flux[-0.20], rel=1e-9)


def test_both_tables_of_sodium_d1_agree():
    line = lines()["na_d1"]
    assert line.g is not None
    assert table_value(table("na_d1"), line.g.velocity) == pytest.approx(np.array(line.g.g), rel=0.03)


def test_telluric_line_in_d2_is_bridged():
    d2 = table("na_d2")
    velocities = np.linspace(13.1e3, 17.9e3, 40)
    line = np.interp(velocities, [12.72e3, 18.32e3], table_value(d2, [12.72e3, 18.32e3]))
    assert table_value(d2, velocities) == pytest.approx(line, rel=1e-3)
    # Unbridged, the table of g dips to 5.686 at 16 km/s.
    assert table_value(d2, 16e3) > 6.0


def test_kernel_reads_what_numpy_reads():
    for name in ("na_d2", "k_d1", "al_3961"):
        found = table(name)
        packed = line_tables([found])
        for velocity in np.linspace(-90e3, 90e3, 301):
            assert line_value(packed, 0, velocity) == pytest.approx(table_value(found, velocity), rel=1e-9)


def test_knots_of_a_catalogue_table_are_met():
    line = lines()["ca2_k"]
    assert line.g is not None
    packed = line_tables([table("ca2_k")])
    for velocity, g in zip(line.g.velocity, line.g.g, strict=True):
        assert line_value(packed, 0, velocity) == pytest.approx(g, rel=1e-12)


def test_lines_without_g_have_no_table():
    for name in ("mg_2852", "h_lyman_alpha", "he_584", "o_1302"):
        assert catalogue_table(lines()[name]) is None


def test_push_is_the_photons_momentum():
    mass = 3.8e-26
    packed = push_tables([constant_table("mine", 500e-9, 2.0)], mass)
    assert line_value(packed, 0, 1e4) == pytest.approx(2.0 * 6.62607015e-34 / (mass * 500e-9), rel=1e-12)


def test_lines_with_the_same_knots_push_by_one_table():
    mass = 6.5e-26
    tables = [table("ca2_k"), table("ca2_h"), constant_table("mine", 500e-9, 2.0)]
    packed = push_tables(tables, mass)
    assert packed[0] == 2.0
    for velocity in (-30e3, -1234.5, 0.0, 7e3, 30e3):
        expected = line_acceleration(tables, mass, velocity)
        assert sum_of_lines(packed, velocity) == pytest.approx(float(expected), rel=1e-12)


def test_uneven_table_of_the_user_is_met_at_its_knots():
    velocities = np.array([-10e3, -2.5e3, 0.0, 1.2e3, 30e3])
    g = np.array([1.0, 0.2, 0.0, 0.4, 2.0])
    packed = line_tables([table_of("mine", 500e-9, velocities, g)])
    for velocity, value in zip(velocities, g, strict=True):
        assert line_value(packed, 0, velocity) == pytest.approx(value, abs=1e-12)
    assert line_value(packed, 0, 600.0) == pytest.approx(0.2, rel=1e-12)


@pytest.mark.parametrize(
    ("velocities", "g", "message"),
    [
        ([0.0], [1.0], "at least two"),
        ([0.0, 1e3], [1.0, -1.0], "not negative"),
        ([0.0, np.nan], [1.0, 1.0], "finite"),
        ([1e3, 0.0], [1.0, 1.0], "rise"),
    ],
)
def test_bad_table_is_refused(velocities, g, message):
    with pytest.raises(ValueError, match=message):
        table_of("mine", 500e-9, np.array(velocities), np.array(g))
