"""Sums over a product that must agree with each other whatever the chances were."""

from math import pi

import numpy as np
import pytest

from tracer.engine.runspec.load import parse_run
from tracer.fate import Fate

HAZARD = 1e-5  # of the small run's [[gas.loss]]
RATES = np.array([2e24, 5e23])


def over_ground(product, name: str) -> np.ndarray:
    """Return the integral of a flux over the ground [s-1], one a release."""
    return (product[name] * product.cell_area).sum(("latitude", "local_time")).values


def fates(product, fate: str) -> np.ndarray:
    return product.ledger.sel(fate=fate).values


def test_every_released_atom_ends_once(small_product):
    # To rounding: the weights of a batch's atoms sum to the rate, and what roulette adds is booked.
    ends = small_product.ledger.sum("fate") - small_product.roulette_balance
    np.testing.assert_allclose(ends.values, RATES, rtol=1e-9)
    assert np.all(fates(small_product, "unresolved") == 0.0)
    assert np.all(small_product.ledger.values >= 0.0)


def test_small_run_has_every_fate_that_gravity_knows(small_product):
    for fate in ("captured", "escaped", "other_loss"):
        assert np.all(fates(small_product, fate) > 0.0)
    assert np.all(fates(small_product, "ionized") == 0.0)


def test_release_flux_integrates_to_the_rate(small_product):
    np.testing.assert_allclose(over_ground(small_product, "release_flux"), RATES, rtol=1e-12)


def test_capture_flux_integrates_to_the_captured(small_product):
    np.testing.assert_allclose(
        over_ground(small_product, "capture_flux"), fates(small_product, "captured"), rtol=1e-12
    )


def test_escape_by_first_release_and_by_direction_are_the_escaped(small_product):
    escaped = fates(small_product, "escaped")
    np.testing.assert_allclose(over_ground(small_product, "escape_flux"), escaped, rtol=1e-12)
    solid_angle = small_product.cell_area / small_product.attrs["body_radius"] ** 2
    assert solid_angle.sum().item() * small_product.sizes["local_time"] == pytest.approx(4.0 * pi)
    by_direction = (small_product.escape_rate_by_direction * solid_angle).sum(("latitude", "local_time"))
    np.testing.assert_allclose(by_direction.values, escaped, rtol=1e-12)


def test_every_launch_but_the_first_is_a_landing_that_did_not_stick(small_product):
    bounced = over_ground(small_product, "return_flux") - over_ground(small_product, "capture_flux")
    # Under gravity alone roulette is played between landing and launch.
    bounced += small_product.roulette_balance.values
    np.testing.assert_allclose(bounced, RATES * (small_product.mean_flights.values - 1.0), rtol=1e-12)
    assert np.all(small_product.mean_flights.values > 1.0)


def test_sticking_is_the_share_of_landings_that_is_captured(small_product):
    returned = over_ground(small_product, "return_flux")
    share = over_ground(small_product, "capture_flux") / returned
    # The run file's sticking is 0.4. Binomial; survival weights below 1 make it cautious.
    landings = 6 * 250 * returned / RATES
    assert np.all(np.abs(share - 0.4) < 4.0 * np.sqrt(0.4 * 0.6 / landings))


def test_constant_loss_takes_its_rate_times_the_mean_life(small_product):
    # d(weight)/dt = -hazard weight, integrated: an identity, not an estimate.
    expected = RATES * HAZARD * small_product.mean_life.values
    np.testing.assert_allclose(fates(small_product, "other_loss"), expected, rtol=1e-9)


def test_vertical_column_is_the_density_seen_from_the_ground(small_product):
    # A sample at r weighs (R/r)^2 against the ground cell: the column lies between both edges of each layer.
    radius = small_product.attrs["body_radius"]
    content = small_product.number_density * small_product.cell_volume
    shrink = (radius / (radius + small_product.altitude_bounds)) ** 2
    low = (content * shrink.isel(bounds=1)).sum("altitude")
    high = (content * shrink.isel(bounds=0)).sum("altitude")
    column = small_product.vertical_column * small_product.cell_area
    hit = column > 0.0
    assert hit.sum() > 20
    assert bool(((low < column) & (column < high)).where(hit, True).all())


def test_content_of_a_grid_that_holds_all_is_rate_times_mean_life(small_run_file, traced):
    text = small_run_file.read_text(encoding="utf-8")
    changes = (
        ('outer_radius = "20 radii"', 'outer_radius = "4 radii"'),
        ('top = "3 radii"', 'top = "3.1 radii"'),
    )
    for old, new in changes:
        assert old in text
        text = text.replace(old, new)
    product = traced(text.replace("batches = 6\nreplicates = 3", "batches = 40\nreplicates = 40"))
    content = (product.number_density * product.cell_volume).sum(("altitude", "latitude", "local_time"))
    each = (product.number_density_replicates * product.cell_volume).sum(
        ("altitude", "latitude", "local_time")
    )
    error = each.std("replicate", ddof=1).values / np.sqrt(40.0)
    # The life is exact for each flight, the content sampled: they share most of their scatter, which bounds the
    # difference's. Four standard errors of 40 replicates, false alarm 3e-4 each.
    assert np.all(np.abs(content.values - RATES * product.mean_life.values) < 4.0 * error)
    np.testing.assert_allclose(content.values, RATES * product.mean_life.values, rtol=0.02)


def test_age_limit_ends_atoms_that_do_nothing_else(small_run_file, traced):
    text = small_run_file.read_text(encoding="utf-8")
    spec = parse_run(text, "run file", ["domain.age_limit=60 s", "surface.sticking=0.0"])
    from_text = text.replace('age_limit = "30 d"', 'age_limit = "60 s"').replace(
        "sticking = 0.4", "sticking = 0.0"
    )
    assert parse_run(from_text, "run file") == spec
    product = traced(from_text)
    kept = np.exp(-HAZARD * 60.0)
    # No atom is captured or reaches 20 radii within a minute: all that the loss leaves is there at the limit.
    np.testing.assert_allclose(fates(product, Fate.AGE_LIMIT.label), RATES * kept, rtol=1e-12)
    np.testing.assert_allclose(product.mean_life.values, (1.0 - kept) / HAZARD, rtol=1e-9)
