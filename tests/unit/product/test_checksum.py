import numpy as np
import pytest

from tracer.product.assembling import with_label_indexes, without_label_indexes
from tracer.product.checksum import data_checksum


def test_checksum_depends_neither_on_attributes_nor_order_nor_indexes(product):
    told = data_checksum(product)
    other = product.assign_attrs(title="another", wall_seconds=99.0)
    other.ledger.attrs["long_name"] = "other words"
    names = list(other.variables)
    assert data_checksum(other) == told
    assert data_checksum(without_label_indexes(other)) == told
    assert data_checksum(with_label_indexes(without_label_indexes(other))) == told
    assert data_checksum(other[[name for name in reversed(names) if name in other.data_vars]]) == told


def test_checksum_does_not_see_how_memory_is_laid_out(product):
    big = product.number_density.astype(">f8")
    fortran = product.number_density.copy(data=np.asfortranarray(product.number_density.values))
    assert data_checksum(product.assign(number_density=big)) == data_checksum(product)
    assert data_checksum(product.assign(number_density=fortran)) == data_checksum(product)


def test_checksum_takes_every_nan_for_the_same(product):
    negative = product.copy(deep=True)
    error = negative.ledger_standard_error.values
    error[np.isnan(error)] = -np.nan
    assert np.signbit(error.flat[0])
    assert data_checksum(negative) == data_checksum(product)


def _last_bit(ds):
    values = ds.number_density.values.copy()
    values.flat[-1] = np.nextafter(values.flat[-1], 2.0)
    return ds.assign(number_density=ds.number_density.copy(data=values))


CHANGES = {
    "the last bit of one cell": _last_bit,
    "a coordinate": lambda ds: ds.assign_coords(altitude=ds.altitude * 2.0),
    "a label": lambda ds: ds.assign_coords(release_name=("release", ["photon desorption", "Verdampfung e"])),
    "a name": lambda ds: ds.rename(mean_life="mean_lifetime"),
    "a variable less": lambda ds: ds.drop_vars("cell_area"),
    "the type": lambda ds: ds.assign(number_density_replicates=ds.number_density_replicates.astype("f8")),
    "the order of dimensions": lambda ds: ds.assign(cell_volume=ds.cell_volume.T),
    "the sign of zero": lambda ds: ds.assign(ledger=ds.ledger.where(ds.ledger != 0.0, -0.0)),
}


@pytest.mark.parametrize("change", CHANGES.values(), ids=CHANGES.keys())
def test_checksum_sees_any_change_of_the_data(product, change):
    assert data_checksum(change(product)) != data_checksum(product)


def test_checksum_tells_neighbouring_strings_apart(product):
    first = product.assign_coords(release_name=("release", ["ab", "c"]))
    second = product.assign_coords(release_name=("release", ["a", "bc"]))
    assert data_checksum(first) != data_checksum(second)
