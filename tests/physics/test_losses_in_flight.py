"""Gas that flies off without gravity and is lost on the way: Haser 1957, Bull. Soc. R. Sci. Liege 43, 740."""

from math import exp, pi, sqrt

import numpy as np
import pytest

RADIUS, RATE, SPEED, LIFE, OUTER = 1e5, 1e20, 500.0, 400.0, 10.0

RUN = """
title = "Haser"
[body]
name = "Pebble"
radius = "100 km"
gm = "0 km3 s-2"
GAS
[[release]]
name = "jet"
rate = "1e20 s-1"
speed = { law = "single", speed = "500 m/s" }
direction = { law = "normal" }
[surface]
sticking = 1.0
[domain]
outer_radius = "10 radii"
[grid]
altitude = { first_cell = "40 km", top = "8 radii", cells = 8 }
latitude_cells = 2
local_time_cells = 3
[ensemble]
particles_per_batch = 2_000
batches = 100
replicates = 100
"""
CONSTANT = RUN.replace(
    "GAS",
    """[gas]
species = "H2O"
[[gas.loss]]
name = "photodissociation"
rate = "0.002 s-1"
[[gas.loss]]
name = "photoionisation"
rate = "0.0005 s-1"
scaling = "constant"
where = "everywhere"
""",
)
SUNLIT = (
    RUN.replace(
        "GAS",
        """[sun]
distance = "1 au"
shadow = "none"
[gas]
species = "parent"
mass = "18 u"
photoionization_rate = "0.0025 s-1"
radiation_acceleration = "none"
""",
    )
    .replace('top = "8 radii"', 'top = "9 radii"')
    .replace("particles_per_batch = 2_000", "particles_per_batch = 1_000")
)
"""On arcs, and integrated."""


@pytest.mark.parametrize("text", [CONSTANT, SUNLIT], ids=["on arcs", "integrated in sunlight"])
def test_density_is_hasers(traced, text):
    haser = traced(text)
    # n(r) = Q/(4 pi r^2 v) exp(-(r - R)/(v tau)), so that a shell's mean is Q tau times the drop over it by volume.
    weights = haser.cell_volume / haser.cell_volume.sum("latitude") / haser.sizes["local_time"]
    found = (haser.number_density * weights).sum(("release", "latitude", "local_time")).values
    each = (haser.number_density_replicates * weights).sum(("release", "latitude", "local_time"))
    error = each.std("replicate", ddof=1).values / sqrt(100.0)
    edges = haser.altitude_bounds.values
    left = np.exp(-edges / (SPEED * LIFE))
    content = RATE * LIFE * (left[:, 0] - left[:, 1])
    expected = content / (4.0 / 3.0 * pi * ((RADIUS + edges[:, 1]) ** 3 - (RADIUS + edges[:, 0]) ** 3))
    # 100 replicates, Student's t of 99 degrees of freedom: false alarm 1.2e-4 a shell.
    assert np.all(np.abs(found - expected) < 4.0 * error)
    np.testing.assert_allclose(found, expected, rtol=0.02)
    # Without the loss the outermost shell would hold 40 times as much or more: n ~ 1/r^2 alone is refused.
    lossless = RATE / SPEED * (edges[:, 1] - edges[:, 0]) / (content / expected)
    assert np.abs((found - lossless) / error)[1:].min() > 20.0


def test_what_reaches_the_outer_sphere_is_exact(traced):
    haser = traced(CONSTANT)
    # Every atom flies 9 R at the same speed: no chance is left in the budget.
    survival = exp(-(OUTER - 1.0) * RADIUS / (SPEED * LIFE))
    assert haser.ledger.sel(fate="escaped").item() == pytest.approx(RATE * survival, rel=1e-9)
    assert haser.ledger.sel(fate="other_loss").item() == pytest.approx(RATE * (1.0 - survival), rel=1e-9)
    assert haser.mean_life.item() == pytest.approx(LIFE * (1.0 - survival), rel=1e-9)
    assert haser.mean_flights.item() == 1.0


def test_rates_of_all_losses_add_up(traced):
    one = traced(CONSTANT.replace('"0.002 s-1"', '"0.0025 s-1"').replace('"0.0005 s-1"', '"0 s-1"'))
    assert one.ledger.values == pytest.approx(traced(CONSTANT).ledger.values, rel=1e-12)


def test_ionised_share_and_mean_life_are_exact(traced):
    haser = traced(SUNLIT)
    # Every atom flies 9 R at the same speed: no chance is left. The light differs by 1e-5 between atoms flown towards
    # the Sun and away from it, which cancels but for the square.
    lost = 1.0 - exp(-(OUTER - 1.0) * RADIUS / (SPEED * LIFE))
    assert haser.ledger.sel(fate="ionized").item() == pytest.approx(RATE * lost, rel=1e-6)
    assert haser.ledger.sel(fate="escaped").item() == pytest.approx(RATE * (1.0 - lost), rel=1e-5)
    assert haser.ledger.sel(fate="other_loss").item() == 0.0
    # Steps of an unhindered flight hold more than two lifetimes: survival must not be taken as smooth over a step.
    assert haser.mean_life.item() == pytest.approx(LIFE * lost, rel=1e-6)


def test_ions_are_made_where_the_gas_is(traced):
    haser = traced(SUNLIT)
    rate = haser.number_density / LIFE
    np.testing.assert_allclose(haser.ionization_rate.values, rate.values, rtol=3e-5)


def test_ions_made_in_all_cells_are_those_of_the_budget(traced):
    haser = traced(SUNLIT)
    # The budget is integrated, the cells are sampled: only the grid's top, 10 R, is common to both.
    cells = (haser.ionization_rate * haser.cell_volume).sum().item()
    each = (haser.number_density_replicates / LIFE * haser.cell_volume).sum(
        ("release", "altitude", "latitude", "local_time")
    )
    error = each.std(ddof=1).item() / sqrt(100.0)
    # Student's t of 99 degrees of freedom: false alarm 1.2e-4.
    assert abs(cells - haser.ledger.sel(fate="ionized").item()) < 4.0 * error
    assert error < 0.002 * cells
