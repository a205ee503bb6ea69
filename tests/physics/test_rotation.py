"""A launch carries the motion of the ground, which turns to growing local time; landings are where the atom falls."""

from math import atan2, degrees, pi

import numpy as np
import pytest

from tracer.constants import ATOMIC_MASS, BOLTZMANN

GM, RADIUS, SPEED, DAY = 4902.800e9, 1737.4e3, 1000.0, 86400.0
CELLS = 4096
"""The finest local-time axis: 0.0059 h a cell."""

RUN = """
title = "rotation"
[body]
name = "Spinner"
radius = "1737.4 km"
gm = "4902.8 km3 s-2"
{rotation}
[gas]
species = "He"
[[release]]
name = "vent"
rate = "1 s-1"
speed = {{ law = "single", speed = "1 km/s" }}
direction = {{ law = "normal" }}
place = {{ law = "patch", latitude = "0 deg", local_time = 9.0, radius = "1 m" }}
[surface]
sticking = {sticking}
temperature = {{ law = "uniform", value = "{kelvin} K" }}
{accommodation}
[domain]
outer_radius = "50 radii"
age_limit = "{age}"
[grid]
altitude = {{ first_cell = "500 km", top = "1 radii", cells = 1 }}
latitude_cells = 1
local_time_cells = 4096
[ensemble]
particles_per_batch = 50
batches = 2
"""


def landing_hour(traced, rotation: str) -> float:
    product = traced(RUN.format(rotation=rotation, sticking=1.0, kelvin=300, accommodation="", age="1 yr"))
    flux = product.capture_flux.values[0, 0]
    assert np.count_nonzero(flux) <= 2
    return float((flux * product.local_time.values).sum() / flux.sum())


def swept_hours(across: float) -> float:
    """Return the local time [h] swept by a hop of SPEED straight up with `across` [m/s] along the ground.

    Half the arc is the angle from the launch to the apex: tan = h v_r/(GM - h^2/R), h = R v_across the spin.
    """
    h = RADIUS * across
    return 24.0 / pi * atan2(h * SPEED, GM - h * h / RADIUS)


@pytest.mark.parametrize(("period", "sense"), [("1 d", 1.0), ("-1 d", -1.0)])
def test_launch_carries_the_grounds_motion(traced, period, sense):
    # 126 m/s at the equator for 20 minutes: 5 degrees to the east, prograde; a retrograde ground throws it west.
    eastward = 2.0 * pi * RADIUS / DAY
    expected = 9.0 + sense * swept_hours(eastward)
    assert abs(swept_hours(eastward)) > 0.3
    found = landing_hour(traced, f'rotation_period = "{period}"')
    assert found == pytest.approx(expected, abs=24.0 / CELLS)


def test_ground_at_rest_gets_its_atoms_back(traced):
    assert landing_hour(traced, "") == pytest.approx(9.0, abs=24.0 / CELLS)


def test_bouncing_atoms_are_carried_along_by_the_ground(traced):
    # 30 K helium hops 24 times in three hours of a 24 h day, while the ground turns by three hours: on average its
    # landings lie half-way, at 10.5 h. One atom strays by 4 H = 154 km rms a hop, in longitude by sqrt(24/2) 154 km or
    # 1.2 h at the end, the mean of a hundred atoms by about 0.1 h: four of them, false alarm 6e-5.
    product = traced(
        RUN.format(
            rotation='rotation_period = "1 d"',
            sticking=0.0,
            kelvin=30,
            accommodation="accommodation = 1.0",
            age="3 h",
        )
    )
    flux = product.return_flux.values[0, 0]
    angle = (product.local_time.values - 12.0) * pi / 12.0
    mean = 12.0 + degrees(atan2((flux * np.sin(angle)).sum(), (flux * np.cos(angle)).sum())) / 15.0
    height = BOLTZMANN * 30.0 / (4.002602 * ATOMIC_MASS * GM / RADIUS**2)
    assert 4.0 * height == pytest.approx(154e3, rel=0.01)
    assert product.mean_flights.item() == pytest.approx(24.0, rel=0.1)
    assert mean == pytest.approx(10.5, abs=0.4)
