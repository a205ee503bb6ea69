"""Sums over releases and means over cells: values and standard errors."""

import numpy as np
import pytest

from tracer.plots.budget import ALL, budget_of, scientific, share_words
from tracer.plots.field import mean_over_cells, releases, variable
from tracer.plots.ledger import ledger
from tracer.plots.planes import cells_at


def test_variances_of_independent_releases_add(make_product):
    product = make_product(releases=("a", "b"))
    product.vertical_column_standard_error.values[0] = 3.0
    product.vertical_column_standard_error.values[1] = 4.0
    summed = variable(product, "vertical_column", ["a", "b"], 10.0)
    np.testing.assert_allclose(summed.value, 10.0 * product.vertical_column.sum("release"), rtol=1e-14)
    np.testing.assert_allclose(summed.error, 50.0, rtol=1e-14)


def test_release_that_never_hit_a_cell_adds_nothing_to_its_error(make_product):
    product = make_product(releases=("a", "b"))
    product.vertical_column.values[0, 0, 0] = 0.0
    product.vertical_column_standard_error.values[0, 0, 0] = np.nan
    summed = variable(product, "vertical_column", releases(product, None), 1.0)
    assert summed.error[0, 0] == pytest.approx(product.vertical_column_standard_error[1, 0, 0].item())


def test_mean_over_cells_takes_its_error_from_the_replicates(make_product):
    product = make_product(replicates=4)
    replicates = product.number_density_replicates.values
    replicates[:, 0, :, 1], replicates[:, 0, :, 2] = 1.0, 3.0
    replicates[:2, 0, :, 1] = 2.0
    replicates[:2, 0, :, 2] = 4.0
    mean = mean_over_cells(product, "number_density", ["impact vapour"], "latitude", [1, 2], 1.0)
    # Means of the replicates: 3, 3, 2, 2; their spread 1/sqrt(3), over sqrt(4) replicates.
    np.testing.assert_allclose(mean.error, 0.5 / np.sqrt(3.0), rtol=1e-6)
    expected = 0.5 * (product.number_density[0, :, 1] + product.number_density[0, :, 2])
    np.testing.assert_allclose(mean.value, expected, rtol=1e-14)


def test_mean_over_cells_without_replicates_takes_the_bound_of_full_correlation(make_product):
    product = make_product(replicates=0)
    mean = mean_over_cells(product, "number_density", ["impact vapour"], "latitude", [1, 2], 1.0)
    expected = product.number_density_standard_error[0, :, 1:3].mean("latitude")
    np.testing.assert_allclose(mean.error, expected, rtol=1e-14)


def test_plane_lies_in_one_cell_or_between_two():
    assert cells_at(np.array([-90.0, -30.0, 30.0, 90.0]), 0.0) == [1]
    assert cells_at(np.array([-90.0, 0.0, 90.0]), 0.0) == [0, 1]
    assert cells_at(np.linspace(0.0, 24.0, 7), 0.0, 24.0) == [0, 5]
    assert cells_at(np.linspace(0.0, 24.0, 6), 12.0, 24.0) == [2]
    assert cells_at(np.array([0.0, 24.0]), 0.0, 24.0) == [0]


def test_budget_ends_with_the_sum_of_releases(make_product):
    product = make_product(releases=("a", "b"))
    budget = budget_of(product, ["a", "b"])
    assert budget.names == ["a", "b", ALL]
    np.testing.assert_allclose(budget.rate[2], product.ledger.sum("release"), rtol=1e-14)
    expected = np.sqrt((product.ledger_standard_error**2).sum("release"))
    np.testing.assert_allclose(budget.error[2], expected, rtol=1e-12)


def test_fates_that_no_atom_met_are_left_out(make_product):
    product = make_product()
    product.ledger.values[0, 2:] = 0.0
    product.ledger_standard_error.values[0, 2:] = np.nan
    assert budget_of(product, ["impact vapour"]).fates == ["captured", "escaped"]


def test_bars_of_shares_end_at_a_hundred(make_product):
    shares = ledger(make_product(releases=("a", "b"))).axes[0]
    ends = [bar.get_x() + bar.get_width() for bar in shares.patches]
    assert len(ends) == 18
    np.testing.assert_allclose(ends[5::6], 100.0, rtol=1e-12)


def test_one_release_alone_has_no_sum(make_product):
    labels = [
        text.get_text() for text in ledger(make_product(releases=("a", "b")), "b").axes[0].get_yticklabels()
    ]
    assert len(labels) == 1
    assert labels[0].startswith("b\n")


@pytest.mark.parametrize(
    ("share", "error", "letters", "words"),
    [
        (52.7405, 0.0781, 99, "52.740 \N{PLUS-MINUS SIGN} 0.078 %"),
        (52.7405, 0.0781, 8, "52.7 %"),
        (52.7405, 0.0781, 5, "52.7"),
        (52.7405, 0.0781, 3, ""),
        (100.0, 1e-12, 99, "100 %"),
        (40.0, 13.0, 99, "40 \N{PLUS-MINUS SIGN} 13 %"),
        (5.0, float("nan"), 99, "5 %"),
    ],
)
def test_share_is_told_as_fully_as_room_allows(share, error, letters, words):
    assert share_words(share, error, letters) == words


def test_rates_are_written_with_their_power_of_ten():
    assert scientific(2e24) == r"$2\times10^{24}$"
    assert scientific(2.5e-3) == r"$2.5\times10^{-3}$"
    assert scientific(0.0) == "0"


def test_budget_counts_what_was_released_without_what_roulette_added(make_product):
    product = make_product(releases=("a", "b"))
    product.roulette_balance.values[:] = [3e8, -1e8]
    budget = budget_of(product, ["a", "b"])
    released = product.ledger.sum("fate").values - [3e8, -1e8]
    np.testing.assert_allclose(budget.released, [*released, released.sum()], rtol=1e-14)
    words = " ".join(text.get_text() for text in ledger(product).texts).replace("\n", " ")
    assert f"{100.0 * 2e8 / released.sum():+.2g} %" in words
    product.roulette_balance.values[:] = 0.0
    assert "oulette" not in " ".join(text.get_text() for text in ledger(product).texts)
