"""From emission rate to rayleigh, from column to optical depth, and the errors of both."""

import numpy as np
import pytest

from tracer.errors import InputError
from tracer.observe.sightlines import sightlines
from tracer.tally.axes import make_grid

RADIUS = 1.7374e6
GRID = make_grid(RADIUS, 1e5, 4e6, 4, 4, 6)
SHAPE = (4, 4, 6)
CHORD = 2.0 * np.sqrt((RADIUS + 4e6) ** 2 - (RADIUS + 5e4) ** 2)
RAYS = {
    "observer_x_km": [2e4],
    "observer_y_km": [RADIUS / 1e3 + 50.0],
    "observer_z_km": [0.0],
    "look_x": [-1.0],
    "look_y": [0.0],
    "look_z": [0.0],
}


def test_eclipse_sodium_of_known_column_and_brightness_has_its_mean_g(filled):
    # Lunar eclipse sodium: 1145 R and 1.4e9 cm-2 on one line of sight mean g = 0.82 s-1
    # (Mendillo et al. 1999, Icarus 137, 13).
    density = 1.4e13 / CHORD
    ds = filled(GRID, np.full((1, *SHAPE), density), np.full((1, 1, *SHAPE), 1145e10 / CHORD))
    table = sightlines(ds, RAYS)
    assert table["column_m2"][0] == pytest.approx(1.4e13, rel=1e-9)
    assert table["brightness_na_d2_rayleigh"][0] == pytest.approx(1145.0, rel=1e-9)
    g = 1e10 * table["brightness_na_d2_rayleigh"][0] / table["column_m2"][0]
    assert round(float(g), 2) == 0.82


def test_g_of_one_atom_becomes_rayleigh(filled):
    # 4 pi I = g N: 1e13 m-2 at g = 0.82 s-1 are 820 R.
    density = 1e13 / CHORD
    ds = filled(GRID, np.full((1, *SHAPE), density), np.full((1, 1, *SHAPE), 0.82 * density))
    assert sightlines(ds, RAYS)["brightness_na_d2_rayleigh"][0] == pytest.approx(820.0, rel=1e-9)


def test_optical_depth_is_that_of_the_formula_in_gaussian_units(filled):
    # tau = N pi e^2 f/(m_e c) lambda/(sqrt(pi) b) with e = 4.80320e-10 esu, m_e = 9.10938e-28 g.
    run_file = (
        '[gas]\nspecies = "Na"\n[[release]]\nname = "release 0"\n'
        'speed = { law = "maxwell-flux", temperature = "1200 K" }\n'
    )
    for column_cm2, thick in ((4e10, False), (6e10, True)):
        density = np.full((1, *SHAPE), column_cm2 * 1e4 / CHORD)
        ds = filled(GRID, density, np.ones((1, 1, *SHAPE)), run_file=run_file)
        b = np.sqrt(2.0 * 1.380649e-16 * 1200.0 / (22.98977 * 1.660539e-24))
        section = np.pi * 4.80320e-10**2 * 0.6405 / (9.10938e-28 * 2.99792458e10)
        depth = column_cm2 * section * 5891.58326e-8 / (np.sqrt(np.pi) * b)
        table = sightlines(ds, RAYS)
        assert table["optical_depth_na_d2"][0] == pytest.approx(depth, rel=1e-5)
        assert (depth > 0.3) == thick
        assert table["thick"][0] == thick
        halved = sightlines(ds, RAYS, doppler_speed=2e-2 * b)
        assert halved["optical_depth_na_d2"][0] == pytest.approx(0.5 * depth, rel=1e-5)


def test_line_without_a_known_strength_has_no_depth(filled):
    ds = filled(GRID, np.full((1, *SHAPE), 1e9), np.ones((1, 1, *SHAPE)), lines=("invented",))
    table = sightlines(ds, RAYS, doppler_speed=900.0)
    assert np.isnan(table["optical_depth_invented"][0])
    assert not table["thick"][0]


def test_error_is_the_scatter_of_the_replicates_along_the_ray(filled):
    random = np.random.default_rng(3)
    batches = np.array([2, 1, 1, 1, 1])
    rates = np.array([1e9, 4e8])
    factors = random.normal(1.0, 0.1, (5, 2))
    mean = (factors * batches[:, None]).sum(axis=0) / batches.sum()
    fill = np.ones(SHAPE)
    ds = filled(
        GRID,
        (rates * mean)[:, None, None, None] * fill,
        replicates=(rates * factors)[:, :, None, None, None] * fill,
        replicate_batches=batches,
    )
    table = sightlines(ds, RAYS, by_release=True)
    np.testing.assert_allclose(table["column_m2_release_1"][0], 4e8 * mean[1] * CHORD, rtol=1e-9)
    sums = {
        "": factors @ rates,
        "_release_0": factors[:, 0] * rates[0],
        "_release_1": factors[:, 1] * rates[1],
    }
    for ending, values in sums.items():
        # The mean over six batches, five groups: weighted variance over (5 - 1) * 6.
        centre = (values * batches).sum() / 6.0
        error = np.sqrt((batches * (values - centre) ** 2).sum() / (4.0 * 6.0)) * CHORD
        assert table[f"column_standard_error_m2{ending}"][0] == pytest.approx(error, rel=1e-5)


def test_lines_whose_columns_would_have_one_name_are_refused(filled):
    emission = np.ones((2, 1, *SHAPE))
    ds = filled(GRID, np.ones((1, *SHAPE)), emission, lines=("na d2", "na-d2"))
    with pytest.raises(InputError, match='line "na-d2" and line "na d2" would have the same columns, _na_d2'):
        sightlines(ds, RAYS)


def test_releases_add_up(filled):
    random = np.random.default_rng(4)
    density, emission = random.random((2, *SHAPE)), random.random((2, 2, *SHAPE))
    ds = filled(GRID, density, emission, lines=("na_d2", "na_d1"))
    table = sightlines(ds, RAYS, by_release=True)
    for name in (
        "column_m2",
        "column_lit_m2",
        "brightness_na_d2_rayleigh",
        "brightness_na_d1_rayleigh",
    ):
        parts = table[f"{name}_release_0"][0] + table[f"{name}_release_1"][0]
        assert table[name][0] == pytest.approx(parts, rel=1e-14)
