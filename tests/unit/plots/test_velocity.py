"""Line shapes, shifts and widths as figures show them."""

import numpy as np
import pytest

from tracer.errors import InputError
from tracer.plots.apertures import apertures
from tracer.plots.curves import draw_legend, release_curve
from tracer.plots.page.figure_list import product_figures
from tracer.plots.sky import shining, sky_of
from tracer.plots.style import WIDTHS, blank_figure, styled
from tracer.plots.velocity import resolved_sky, velocity
from tracer.plots.velocity_sums import profiles, velocities_by_pixel, velocities_in
from tracer.product.layout import ratio_names
from tracer.tally.velocity_moments import Moments, jackknife_errors, joined

NORTH, SUN = "tail_from_north", "from_the_sun"
RADIUS = 1.8e6


@pytest.fixture
def product(make_product):
    return make_product(releases=("impact vapour", "sputtering"), resolved=(NORTH, SUN), replicates=5)


def test_disc_and_tail_are_where_they_are(product):
    # Seen from north the Sun is at the right: seven pixels from -4 to 3 radii, five from -2 to 2.
    parts = apertures(product, sky_of(product, NORTH), RADIUS)
    assert parts[0].words == "disc of the body"
    assert np.argwhere(parts[0].pixels).tolist() == [[1, 3], [1, 4], [2, 3], [2, 4], [3, 3], [3, 4]]
    tail = np.any([one.pixels for one in parts[1:]], axis=0)
    # Pixels of 0.8 radii: three rows lie within a radius of the axis.
    assert np.argwhere(tail).tolist() == [[row, column] for row in (1, 2, 3) for column in (0, 1, 2)]
    assert all("tail" in one.words for one in parts[1:])


def test_from_the_sun_there_are_rings(product):
    parts = apertures(product, sky_of(product, SUN), RADIUS)
    assert all("ring" in one.words for one in parts[1:])


def test_an_image_without_body_and_tail_is_one_part(product):
    moved = product.copy(deep=True)
    moved[f"{NORTH}_horizontal_bounds"].values[...] += 20.0 * RADIUS
    parts = apertures(moved, sky_of(moved, NORTH), RADIUS)
    assert [one.words for one in parts] == ["whole image"]


def test_line_shapes_are_means_over_pixels_and_sums_over_releases(product):
    parts = apertures(product, sky_of(product, NORTH), RADIUS)
    names = ["impact vapour", "sputtering"]
    found = profiles(product, f"column_by_velocity_{NORTH}", names, parts, 2.0)
    stored = product[f"column_by_velocity_{NORTH}"].values
    for part, field in zip(parts, found, strict=True):
        expected = 2.0 * stored[..., part.pixels].mean(axis=-1).sum(axis=0)
        np.testing.assert_allclose(field.value, expected, rtol=1e-12)
        assert (field.error > 0.0).all()


def test_velocities_of_releases_together_are_weighted(product):
    names = ["impact vapour", "sputtering"]
    source = shining(product, "na_d2")
    variables = ratio_names(NORTH, True)
    weight, mean, width = (source[name].values for name in variables)
    expected = joined([Moments(weight[i], mean[i], width[i]) for i in range(2)], [1, 1])
    found = velocities_by_pixel(source, variables, names)
    np.testing.assert_allclose(found.mean, 1e-3 * expected.mean, rtol=1e-12)
    np.testing.assert_allclose(found.width, 1e-3 * expected.width, rtol=1e-12)
    assert (found.mean_error > 0.0).all()
    part = apertures(product, sky_of(product, NORTH), RADIUS)[0]
    added = velocities_in(source, variables, names, [part])
    inside = [weight[:, part.pixels], mean[:, part.pixels]]
    np.testing.assert_allclose(added.mean[0], 1e-3 * np.average(inside[1], weights=inside[0]), rtol=1e-12)


def test_errors_of_one_release_are_those_of_its_replicates(product):
    variables = ratio_names(NORTH, False)
    found = velocities_by_pixel(product, variables, ["sputtering"])
    groups = [
        Moments(*(product[name + "_replicates"].values[group, 1].astype(float) for name in variables))
        for group in range(5)
    ]
    mean, width = jackknife_errors(groups, [1] * 5)
    np.testing.assert_allclose(found.mean_error, 1e-3 * mean, rtol=1e-9)
    np.testing.assert_allclose(found.width_error, 1e-3 * width, rtol=1e-9)


def test_an_image_without_velocities_is_refused(make_product, product):
    with pytest.raises(InputError, match="no image is resolved by velocity; give one velocity"):
        velocity(make_product())
    with pytest.raises(InputError, match="2 images are resolved by velocity, name one of them"):
        velocity(product)
    with pytest.raises(InputError, match='image "from_dawn" is not resolved by velocity'):
        velocity(product, "from_dawn")
    assert resolved_sky(make_product(resolved=(SUN,)), None).name == SUN


def test_a_pixel_that_was_never_hit_has_no_colour_and_is_hatched(make_product):
    product = make_product(resolved=(NORTH,), replicates=5)
    for ending in ("", "_replicates"):
        product[f"column_{NORTH}{ending}"].values[..., 0, 0] = 0.0
        for name in (f"mean_velocity_{NORTH}", f"velocity_width_{NORTH}"):
            product[name + ending].values[..., 0, 0] = np.nan
    found = velocities_by_pixel(product, ratio_names(NORTH, False), ["impact vapour"])
    assert not found.hit[0, 0]
    assert found.hit.sum() == found.hit.size - 1
    assert not found.significant[0, 0]
    figure = velocity(product, width="column")
    with styled():
        figure.canvas.draw()


def test_page_shows_velocities_of_resolved_images(product, make_product):
    figures = {one.name: one for one in product_figures(product)}
    names = [name for name in figures if "velocity" in name]
    assert sorted(names) == sorted(f"figure-velocity-{image}-{line}" for image, line in shown(names))
    words = figures[next(name for name in names if NORTH in name)].alternative
    assert "disc of the body: mean" in words
    assert not [one for one in product_figures(make_product()) if "velocity" in one.name]


def shown(names):
    """Return images and lines out of the names of figures."""
    return [
        (image, line)
        for image in (NORTH, SUN)
        for line in ("na_d1", "na_d2")
        if f"figure-velocity-{image}-{line}" in names
    ]


@pytest.mark.parametrize("width", ["column", "full"])
def test_legend_has_room_for_numbers_with_their_errors(width):
    minus, error = "\N{MINUS SIGN}", "\N{PLUS-MINUS SIGN}"
    name = f"tail 1.5 to 3.4 radii: {minus}0.26 {error} 0.01, width 1.028 {error} 0.008 km/s"
    figure = blank_figure(WIDTHS[width], 40.0)
    draw_legend(figure, [release_curve(number, name) for number in range(4)], width, 30.0)
    assert [text.get_text() for text in figure.legends[0].get_texts()] == 4 * [name]
