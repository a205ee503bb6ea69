import numpy as np
import pytest

from tracer.product.assembling import assemble
from tracer.product.layout import layout
from tracer.tally.axes import make_image_plane

TABLE = layout(["tail_from_north"])
TALLIED = [name for name, row in TABLE.items() if row.tallied]
REPLICATED = [name for name, row in TABLE.items() if row.replicated]


@pytest.mark.parametrize("name", TALLIED)
def test_every_tallied_variable_names_its_standard_error(product, fields, name):
    error = product[product[name].attrs["ancillary_variables"]]
    assert error.name == f"{name}_standard_error"
    assert error.dims == product[name].dims
    assert error.attrs["units"] == product[name].attrs["units"]
    np.testing.assert_array_equal(error.values, fields[name].standard_error)
    np.testing.assert_array_equal(product[name].values, fields[name].mean)


@pytest.mark.parametrize("name", REPLICATED)
def test_replicates_lead_with_their_dimension_in_single_precision(product, fields, name):
    replicates = product[f"{name}_replicates"]
    assert replicates.dims == ("replicate", *product[name].dims)
    assert replicates.dtype == np.float32
    np.testing.assert_array_equal(replicates.values, fields[name].replicates.astype(np.float32))


def test_a_run_without_replicates_has_no_replicate_dimension(grid, planes, fields):
    bare = {name: field._replace(replicates=None) for name, field in fields.items()}
    ds = assemble(grid, planes, ["a", "b"], bare, {}, {})
    assert "replicate" not in ds.dims
    assert "surface_temperature" not in ds


def test_labels_select_along_their_dimensions(product):
    assert product.ledger.sel(release="Verdampfung é", fate="escaped") == product.ledger[1, 1]


@pytest.mark.parametrize("axis", ["altitude", "latitude", "local_time", "tail_from_north_horizontal"])
def test_each_cell_coordinate_is_the_middle_of_its_bounds(product, axis):
    bounds = product[product[axis].attrs["bounds"]]
    np.testing.assert_allclose(bounds.mean("bounds"), product[axis], rtol=1e-15, atol=0)
    np.testing.assert_array_equal(bounds[1:, 0], bounds[:-1, 1])


def test_an_image_carries_the_directions_it_was_seen_from(product, planes):
    attributes = product.column_tail_from_north.attrs
    assert attributes["long_name"] == "column density along the line of sight, Tail from north"
    assert tuple(attributes["toward_viewer"]) == planes[0].toward_viewer
    assert tuple(attributes["up"]) == planes[0].up
    assert tuple(attributes["right"]) == planes[0].right


def test_an_attribute_that_is_not_known_is_left_out(make_product):
    ds = make_product(git_commit=None, wall_seconds=1.5)
    assert "git_commit" not in ds.attrs
    assert ds.attrs["wall_seconds"] == 1.5


def test_a_missing_and_an_unknown_field_are_refused(grid, planes, fields):
    fields["ledgr"] = fields.pop("ledger")
    with pytest.raises(ValueError, match=r"missing \['ledger'\], unknown \['ledgr'\]"):
        assemble(grid, planes, ["a", "b"], fields, {}, {})


def test_a_field_of_another_shape_is_refused(grid, planes, fields):
    with pytest.raises(
        ValueError, match=r"number_density has shape \(2, 4, 3, 5\), its dimensions .* \(1, 4, 3, 5\)"
    ):
        assemble(grid, planes, ["a"], fields, {}, {})


def test_images_whose_names_collide_are_refused(grid, planes, fields):
    other = make_image_plane("tail_from_north_replicates", "", (0, 0, 1), (0, 1), (0, 1), (1, 1))
    with pytest.raises(ValueError, match="column_tail_from_north_replicates"):
        assemble(grid, [*planes, other], ["a", "b"], fields, {}, {})
