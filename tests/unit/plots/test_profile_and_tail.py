"""Altitude profiles and tail profiles: what is averaged over what, with which error, beside which curve."""

from math import pi, sqrt

import numpy as np
import pytest

from tracer.constants import ATOMIC_MASS, BOLTZMANN
from tracer.errors import InputError
from tracer.plots.profile import profile
from tracer.plots.sky import sky_of
from tracer.plots.tail import strip_of, tail
from tracer.plots.thermal_curve import thermal_curve

THERMAL = """
[body]
name = "Harrow"
radius = "1800 km"
gm = "9500 km3 s-2"
[gas]
species = "He"
line = []
loss = []
[[release]]
name = "impact vapour"
rate = "1e24 s-1"
speed = { law = "maxwell-flux", temperature = "450 K" }
direction = { law = "cosine", power = 1.0 }
place = { law = "uniform" }
[surface]
sticking = 1.0
"""


def stairs(axes):
    return [patch.get_data().values for patch in axes.patches if hasattr(patch, "get_data")]


def test_profile_of_a_side_is_the_mean_over_the_volume_of_its_cells(make_product):
    product = make_product(replicates=3)
    day, night = (stairs(axes)[0] for axes in profile(product).axes[:2])
    # Six cells of four hours: 4 to 8 h and 16 to 20 h belong to both sides by halves.
    share = np.array([0.0, 0.5, 1.0, 1.0, 0.5, 0.0])
    for values, part in ((day, share), (night, 1.0 - share)):
        weights = product.cell_volume.values[:, :, None] * part
        expected = (product.number_density.values[0] * weights).sum(axis=(1, 2)) / weights.sum(axis=(1, 2))
        np.testing.assert_allclose(values, 1e-6 * expected, rtol=1e-12)


def test_band_is_the_spread_of_the_replicates_by_their_batches(make_product):
    product = make_product(replicates=3).assign_attrs(replicate_batches=[2, 1, 1])
    product.number_density.values[...] = 2e6
    for replicate, value in enumerate((1e6, 3e6, 3e6)):
        product.number_density_replicates.values[replicate] = value
    # Mean over four batches 2 cm-3; sqrt((2 x 1 + 1 + 1)/(2 x 4)).
    (band,) = profile(product).axes[0].collections
    reach = band.get_paths()[0].get_extents()
    assert reach.x0 == pytest.approx(2.0 - sqrt(0.5))
    assert reach.x1 == pytest.approx(2.0 + sqrt(0.5))


def test_curve_of_a_thermal_release_has_its_jeans_parameter_and_ground_density(make_product):
    product = make_product(title="x").assign_attrs(run_file=THERMAL)
    curve = thermal_curve(product, "impact vapour", 1.8e6)
    mass = 4.002602 * ATOMIC_MASS
    assert curve.jeans == pytest.approx(9.5e12 * mass / (BOLTZMANN * 450.0 * 1.8e6), rel=1e-6)
    flux = 1e24 / (4.0 * pi * 1.8e6**2)
    assert curve.base == pytest.approx(flux * sqrt(2.0 * pi * mass / (BOLTZMANN * 450.0)), rel=1e-6)


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("sticking = 1.0", "sticking = 0.5"),
        ("[gas]", "[sun]\ndistance = '0.4 au'\n[gas]"),
        ("maxwell-flux", "maxwell-gas"),
        ('"uniform"', '"band"'),
        ("power = 1.0", "power = 2.0"),
        ('"450 K"', '"surface"'),
        ("loss = []", 'loss = [{ name = "x", rate = "1e-6 s-1" }]'),
        ("gm =", 'rotation_period = "5 h"\ngm ='),
        ("", ""),
    ],
)
def test_no_curve_where_a_condition_of_chamberlain_fails(make_product, old, new):
    text = THERMAL.replace(old, new) if old else "no TOML ["
    assert text != THERMAL
    assert thermal_curve(make_product().assign_attrs(run_file=text), "impact vapour", 1.8e6) is None


def test_profile_shows_the_curve_where_it_applies(make_product):
    known = make_product().assign_attrs(run_file=THERMAL)
    assert [len(axes.lines) for axes in profile(known).axes[:2]] == [1, 1]
    assert [len(axes.lines) for axes in profile(make_product()).axes[:2]] == [0, 0]


@pytest.mark.parametrize(("name", "sign"), [("tail_from_north", -1.0), ("from_dusk", 1.0)])
def test_tail_runs_away_from_the_sun_along_the_middle_row(make_product, name, sign):
    product = make_product()
    axes = tail(product, name).axes[0]
    x, y = axes.lines[0].get_data()
    # Pixels are one radius wide and 0.8 high: the middle row and its two neighbours lie within one radius.
    rows = product[f"column_{name}"].values[0, 1:4].mean(axis=0)
    places = sign * product[f"{name}_horizontal"].values / product.body_radius
    order = np.argsort(places)
    np.testing.assert_allclose(x, places[order], atol=1e-12)
    np.testing.assert_allclose(y, 1e-4 * rows[order], rtol=1e-12)


def test_tail_of_a_slanted_view_follows_the_sun(make_product):
    product = make_product(views={"slanted": (40.0, 9.0)})
    sky = sky_of(product, None)
    strip = strip_of(product, sky, product.body_radius)
    up, right = np.meshgrid(product.slanted_vertical, product.slanted_horizontal, indexing="ij")
    antisun = -np.array([sky.right[0], sky.up[0]]) / np.hypot(sky.right[0], sky.up[0])
    along = (right * antisun[0] + up * antisun[1]) / product.body_radius
    # An image of the distance downtail itself comes back as the middles of the bins, to half a bin.
    found = strip.means(along)
    assert np.abs(found - strip.middles).max() < 0.5 * np.diff(strip.edges)[0]


def test_view_along_the_tail_is_refused(make_product):
    with pytest.raises(InputError, match="looks along the tail: it has no tail axis"):
        tail(make_product(), "from_the_sun")


def test_brightness_along_the_tail_is_in_kilorayleigh(make_product):
    product = make_product()
    product.brightness_from_dawn.values[1] = 5e3
    axes = tail(product, "from_dawn", "na_d1").axes[0]
    assert axes.get_ylabel() == "Brightness (kR)"
    np.testing.assert_allclose(axes.lines[0].get_ydata(), 5.0)
