"""What sunlight destroys, and what of it becomes an ion, against the light that a straight flight receives."""

from math import exp

import pytest

AU = 1.495978707e11
RADIUS, OUTER, SPEED = 1e5, 1e6, 500.0

RUN = """
title = "losses in sunlight"
[body]
name = "Pebble"
radius = "100 km"
gm = "0 km3 s-2"
[sun]
distance = "0.1 au"
tide = false
shadow = "cylinder"
solar_activity = {activity}
[gas]
species = "{species}"
{gas}
[[release]]
name = "jet"
rate = "1 s-1"
speed = {{ law = "single", speed = "500 m/s" }}
direction = {{ law = "normal" }}
place = {{ law = "patch", latitude = "0 deg", local_time = {hour}, radius = "1 m" }}
[surface]
sticking = 1.0
[domain]
outer_radius = "10 radii"
[grid]
altitude = {{ cells = 1 }}
latitude_cells = 1
local_time_cells = 1
[ensemble]
particles_per_batch = 2
batches = 2
replicates = 0
"""
NOON, MIDNIGHT = 12.0, 0.0
TIME = (OUTER - RADIUS) / SPEED

EXPOSURE = AU**2 / SPEED * (1.0 / (0.1 * AU - OUTER) - 1.0 / (0.1 * AU - RADIUS))
"""Integral of (au/D)^2 dt [s] over the straight flight towards the Sun; 100 times the 1,800 s of the flight.

The turning of the frame throws an atom forwards by 0.6 m/s, which shortens its flight by 1e-6: the tolerance below.
"""

IN_THE_DARK = AU**2 / SPEED * (1.0 / (0.1 * AU + RADIUS) - 1.0 / (0.1 * AU + OUTER))
"""The same over the flight away from the Sun, whatever light there is."""


def shares(traced, *, species="H2O", gas="", hour=NOON, activity=0.0):
    """Return (ionized, other_loss, escaped) of one atom."""
    ds = traced(RUN.format(species=species, gas=gas, hour=hour, activity=activity))
    assert ds.mean_flights.item() == pytest.approx(1.0, rel=1e-12)
    return tuple(ds.ledger.sel(fate=fate).item() for fate in ("ionized", "other_loss", "escaped"))


def expected(ionizing, other):
    """Return the same for hazards [1] over the whole flight."""
    total = ionizing + other
    lost = 1.0 - exp(-total)
    return (lost * ionizing / total, lost * other / total, 1.0 - lost) if total else (0.0, 0.0, 1.0)


@pytest.mark.parametrize(
    ("species", "activity", "ionizing", "other"),
    # Rates at 1 au [s-1] of Huebner, Keady & Lyon 1992, Astrophys. Space Sci. 195, 1 (memory), as the catalogue has
    # them: all channels 1.2e-5 and 2.2e-5 of water, of which 4.1e-7 and 1.0e-6 leave an ion; helium 5.3e-8, 1.5e-7.
    [
        ("H2O", 0.0, 4.1e-7, 1.2e-5 - 4.1e-7),
        ("H2O", 1.0, 1.0e-6, 2.2e-5 - 1.0e-6),
        ("H2O", 0.25, 5.575e-7, 1.45e-5 - 5.575e-7),
        ("He", 0.0, 5.3e-8, 0.0),
        ("He", 1.0, 1.5e-7, 0.0),
        ("CH4", 0.0, 0.0, 7.6e-6),
        # Valiev et al. 2020, Astron. Astrophys. 633, A39: OH lives 2.0e5 s under the quiet Sun.
        ("OH", 0.0, 0.0, 5.0e-6),
        ("O2", 1.0, 0.0, 0.0),
    ],
)
def test_photo_losses_are_those_of_the_catalogue(traced, species, activity, ionizing, other):
    found = shares(traced, species=species, activity=activity)
    assert found == pytest.approx(expected(ionizing * EXPOSURE, other * EXPOSURE), rel=1e-5)


def test_activity_raises_the_ionised_share(traced):
    quiet, active = (shares(traced, activity=activity) for activity in (0.0, 1.0))
    # More water is destroyed and more of what is destroyed leaves an ion: 3.4 % against 4.5 %.
    assert quiet[0] / (quiet[0] + quiet[1]) == pytest.approx(4.1e-7 / 1.2e-5, rel=1e-9)
    assert active[0] / (active[0] + active[1]) == pytest.approx(1.0e-6 / 2.2e-5, rel=1e-9)
    assert active[2] < quiet[2]


@pytest.mark.parametrize(("rate", "hazard"), [("1e-5 s-1", 1e-5), ("0 s-1", 0.0)])
@pytest.mark.parametrize("species", ["H2O", "OH", "O2"])
def test_rate_of_the_run_file_replaces_the_catalogues_and_all_of_it_ionises(traced, species, rate, hazard):
    found = shares(traced, species=species, gas=f'photoionization_rate = "{rate}"')
    assert found == pytest.approx(expected(hazard * EXPOSURE, 0.0), rel=1e-5)


@pytest.mark.parametrize("species", ["H2O", "Na", "OH"])
def test_losses_in_the_dark_are_zero(traced, species):
    gas = 'radiation_acceleration = "none"'
    assert shares(traced, species=species, gas=gas, hour=MIDNIGHT)[:2] == (0.0, 0.0)


LOSS = """photoionization_rate = "0 s-1"
[[gas.loss]]
name = "loss"
rate = "{rate} s-1"
scaling = "{scaling}"
where = "{where}"
"""


@pytest.mark.parametrize(
    ("scaling", "where", "rate", "at_noon", "at_midnight"),
    [
        ("inverse-square", "sunlight", 5e-6, EXPOSURE, 0.0),
        ("inverse-square", "everywhere", 5e-6, EXPOSURE, IN_THE_DARK),
        ("constant", "sunlight", 5e-4, TIME, 0.0),
        ("constant", "everywhere", 5e-4, TIME, TIME),
    ],
)
def test_losses_of_the_run_file_go_with_distance_and_light(
    traced, scaling, where, rate, at_noon, at_midnight
):
    loss = LOSS.format(rate=rate, scaling=scaling, where=where)
    for hour, exposure in ((NOON, at_noon), (MIDNIGHT, at_midnight)):
        found = shares(traced, gas=loss, hour=hour)
        assert found == pytest.approx(expected(0.0, rate * exposure), rel=1e-5)
    # The two sides' distances from the Sun differ by enough to tell them apart at that precision.
    assert abs(EXPOSURE / IN_THE_DARK - 1.0) > 1e-4


def test_losses_of_all_kinds_add_up(traced):
    kinds = [("inverse-square", "sunlight"), ("inverse-square", "everywhere"), ("constant", "sunlight")]
    tables = [
        f'[[gas.loss]]\nname = "{i}"\nrate = "{2e-6 if a == "inverse-square" else 2e-4} s-1"\n'
        f'scaling = "{a}"\nwhere = "{b}"'
        for i, (a, b) in enumerate([*kinds, ("constant", "everywhere")])
    ]
    found = shares(traced, gas="\n".join(tables))
    other = (1.2e-5 - 4.1e-7 + 4e-6) * EXPOSURE + 4e-4 * TIME
    assert found == pytest.approx(expected(4.1e-7 * EXPOSURE, other), rel=1e-5)
