"""Values in the units that people read, labelled so; cells without significance hatched."""

import numpy as np
import pytest
from matplotlib.collections import QuadMesh

from tracer.errors import InputError
from tracer.plots.density import density
from tracer.plots.ground_map import vertical_column
from tracer.plots.hatching import HATCHED, runs
from tracer.plots.image import image

# 1 m-3 = 1e-6 cm-3, 1 m-2 = 1e-4 cm-2, 1 R = 1e-3 kR
UNITS = [
    (density, "number_density", 1e-6, "Number density (cm$^{-3}$)"),
    (vertical_column, "vertical_column", 1e-4, "Column density (cm$^{-2}$)"),
    (lambda ds: image(ds, "from_dawn"), "column_from_dawn", 1e-4, "Column density (cm$^{-2}$)"),
    (lambda ds: image(ds, "from_dawn", "na_d1"), "brightness_from_dawn", 1e-3, "Brightness (kR)"),
]


def cells(axes):
    (mesh,) = [one for one in axes.collections if isinstance(one, QuadMesh)]
    return mesh.get_array()


def is_hatched(axes, x, y):
    """Return whether the point lies under the hatches; a compound path must be asked piece by piece."""
    patches = [one for one in axes.patches if one.get_gid() == HATCHED]
    pieces = [piece for patch in patches for piece in patch.get_path().to_polygons()]
    return any(_winds_round(piece - (x, y)) for piece in pieces)


def _winds_round(corners):
    angle = np.unwrap(np.arctan2(corners[:, 1], corners[:, 0]))
    return abs(angle[-1] - angle[0]) > np.pi


@pytest.mark.parametrize(("figure", "name", "factor", "label"), UNITS)
def test_values_are_in_the_unit_of_the_label(make_product, figure, name, factor, label):
    product = make_product()
    product[name].values[...] = 3e9
    drawn = figure(product)
    np.testing.assert_allclose(cells(drawn.axes[0]), 3e9 * factor, rtol=1e-12)
    assert drawn.axes[-1].get_xlabel() == label


def test_brightness_is_that_of_the_line_asked_for(make_product):
    product = make_product()
    product.brightness_from_dawn.values[1] = 7e6
    np.testing.assert_allclose(cells(image(product, "from_dawn", "na_d1").axes[0]), 7e3, rtol=1e-12)
    assert cells(image(product, "from_dawn", "na_d2").axes[0]).max() > 1e5


def test_title_is_that_of_the_run_file_and_of_the_image(make_product):
    words = [text.get_text() for text in image(make_product(), "from_dawn").texts]
    assert words[:2] == ["Sodium over Harrow", 'from dawn: column density, release "impact vapour"']


def test_cells_with_more_than_half_their_value_in_error_are_hatched(make_product):
    product = make_product()
    value, error = product.vertical_column.values[0], product.vertical_column_standard_error.values[0]
    error[1, 2] = 0.51 * value[1, 2]
    error[2, 4] = 0.49 * value[2, 4]
    axes = vertical_column(product).axes[0]
    hours, latitudes = product.local_time.values, product.latitude.values
    hatched = [[is_hatched(axes, hour, latitude) for hour in hours] for latitude in latitudes]
    assert np.argwhere(hatched).tolist() == [[1, 2]]
    assert cells(axes)[1, 2] == pytest.approx(1e-4 * value[1, 2])


def test_cell_never_hit_is_hatched_without_colour_and_the_caption_says_so(make_product):
    product = make_product()
    product.vertical_column.values[0, 3, 5] = 0.0
    product.vertical_column_standard_error.values[0, 3, 5] = np.nan
    figure = vertical_column(product)
    axes = figure.axes[0]
    assert np.argwhere(np.ma.getmaskarray(cells(axes))).tolist() == [[3, 5]]
    assert is_hatched(axes, product.local_time[5].item(), product.latitude[3].item())
    caption = "Hatched: standard error above half of the value, or no atom counted."
    assert caption in [text.get_text() for text in figure.texts]


def test_cell_of_a_plane_is_hatched_where_it_lies(make_product):
    product = make_product(replicates=0)
    product.number_density_standard_error.values[0, -1, :, 4] = 1e12
    axes = density(product).axes[0]
    middle = 1.0 + product.altitude[-1].item() / product.body_radius
    # Local time 18 h is up, and the fifth of six cells is that from 16 h to 20 h.
    assert is_hatched(axes, 0.0, middle)
    assert not is_hatched(axes, middle, 0.01)


def test_figure_without_doubtful_cells_has_no_hatch_and_no_caption(make_product):
    figure = vertical_column(make_product())
    assert not [one for one in figure.axes[0].patches if one.get_gid() == HATCHED]
    assert len(figure.texts) == 2


def test_runs_cover_exactly_the_true_cells():
    wanted = np.random.default_rng(20310601).random((20, 30)) < 0.4
    covered = np.zeros_like(wanted)
    for row, first, end in runs(wanted):
        assert not covered[row, first:end].any()
        covered[row, first:end] = True
    np.testing.assert_array_equal(covered, wanted)


def test_radii_and_kilometres_agree(make_product):
    product = make_product(radius=1000e3)
    axes = image(product, "from_dawn").axes[0]
    (top,) = [one for one in axes.child_axes if one.get_xlabel()]
    axes.figure.canvas.draw()
    assert top.get_xlabel() == "km"
    np.testing.assert_allclose(top.get_xlim(), 1000.0 * np.array(axes.get_xlim()), rtol=1e-12)


@pytest.mark.parametrize(
    ("figure", "message"),
    [
        (lambda ds: image(ds), "the product has 4 images, name one of them: "),
        (lambda ds: image(ds, "tale"), 'there is no image "tale"; allowed: "tail_from_north", '),
        (lambda ds: image(ds, "from_dawn", "he"), 'there is no line "he"; allowed: "na_d2", "na_d1"'),
        (lambda ds: density(ds, "vent"), 'there is no release "vent"; allowed: "impact vapour"'),
        (
            lambda ds: density(ds.assign_attrs(body_radius=np.nan)),
            "the product does not tell its body_radius",
        ),
    ],
)
def test_what_is_not_in_the_product_is_refused_with_what_is(make_product, figure, message):
    with pytest.raises(InputError) as refusal:
        figure(make_product())
    assert str(refusal.value).startswith(message)


def test_image_is_found_by_the_name_in_the_run_file(make_product):
    assert image(make_product(), "tail from north").axes[0].get_xlabel() == "Toward the Sun (body radii)"


def test_product_without_images_says_what_to_do(make_product):
    with pytest.raises(InputError, match=r"no image; add an \[\[image\]\] to its run file"):
        image(make_product(views={}))
