"""Sticking by the ground's temperature."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tracer.kernels.bounce import Surface, sticking_at
from tracer.kernels.sticking import Sticking, sticking_probability
from tracer.kernels.temperature import QUARTER_POWER, UNIFORM, SurfaceTemperature

SODIUM_ON_SILICA = Sticking(0.5, 250.0, 272.8)


@pytest.mark.parametrize(
    ("kelvin", "probability", "within"),
    # Sodium on silica: 0.5 at 250 K and 0.2 at 500 K (Yakshinskiy & Madey 2005, memory); 272.8 K is 250 K / ln(2.5).
    [(250.0, 0.5, 1e-15), (500.0, 0.2, 1e-4), (250.0 + 272.8, 0.5 / np.e, 1e-15)],
)
def test_exponential_passes_through_the_measured_points(kelvin, probability, within):
    assert sticking_probability(SODIUM_ON_SILICA, kelvin) == pytest.approx(probability, abs=within)


def test_probability_ends_at_one():
    # 0.5 exp((250 - 50)/272.8) = 1.04.
    assert sticking_probability(SODIUM_ON_SILICA, 50.0) == 1.0
    assert sticking_probability(SODIUM_ON_SILICA, 65.0) < 1.0


@given(st.floats(0.0, 1.0), st.floats(1.0, 2000.0), st.floats(0.1, 1e4), st.floats(1.0, 3000.0))
def test_probability_is_one_and_falls_with_temperature(value, at, e_folding, kelvin):
    sticking = Sticking(value, at, e_folding)
    cold, warm = sticking_probability(sticking, kelvin), sticking_probability(sticking, kelvin + 10.0)
    assert 0.0 <= warm <= cold <= 1.0
    assert sticking_probability.py_func(sticking, kelvin) == pytest.approx(cold, rel=1e-13)


def test_a_number_needs_no_temperature():
    nowhere = SurfaceTemperature(UNIFORM, np.nan, np.nan)
    surface = Surface(nowhere, Sticking(0.3, 0.0, np.inf), 1.0, 4000.0, 0.0)
    assert sticking_at(surface, 0.0, 0.0, 1.0) == 0.3


def test_the_ground_decides():
    surface = Surface(SurfaceTemperature(QUARTER_POWER, 500.0, 250.0), SODIUM_ON_SILICA, 1.0, 4000.0, 0.0)
    assert sticking_at(surface, 1.0, 0.0, 0.0) == pytest.approx(0.2, abs=1e-4)
    assert sticking_at(surface, -1.0, 0.0, 0.0) == pytest.approx(0.5, abs=1e-15)
