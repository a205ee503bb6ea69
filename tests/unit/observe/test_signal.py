"""From brightness to counts, ratio and exposure: worked by hand, and back."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tracer.observe.planspec.spectrometer import FieldOfView
from tracer.observe.pointing import field_samples
from tracer.observe.signal import count_rate, exposure_for, signal_to_noise, signal_to_noise_error

RATES = st.floats(1e-6, 1e8)
UNTIMED = settings(deadline=None)


def test_chain_of_an_example_worked_by_hand():
    # 1000 R on 10 cm2 through a field of 1 deg by 0.1 deg with 10 % throughput, 10 s, 100 other counts per second,
    # 4 reads of 5 counts noise. By hand: solid angle 4 atan(tan 0.5 deg tan 0.05 deg / 1.0000385) = 3.046135e-5 sr;
    # 1e13 / (4 pi) = 7.957747e11; times 1e-3 m2, the solid angle and 0.1: S = 2424.04 s-1;
    # SNR = 24240.4 / sqrt(24240.4 + 1000 + 100) = 152.2765.
    field = FieldOfView.model_validate({"width": "1 deg", "height": "0.1 deg", "samples": [4, 2]})
    solid_angle = field_samples(field).solid_angles.sum()
    assert solid_angle == pytest.approx(3.046135e-5, rel=1e-6)
    signal = count_rate(np.array([1000.0]), 1e-3, solid_angle, 0.1)
    assert signal[0] == pytest.approx(2424.04, rel=3e-6)
    assert signal_to_noise(signal, np.array([100.0]), 10.0, 100.0)[0] == pytest.approx(152.2765, rel=3e-6)


def test_whole_hemisphere_sides_have_their_solid_angles():
    # A pyramid of 90 deg by 90 deg is a face of the cube: 4 pi / 6.
    field = FieldOfView.model_validate({"width": "90 deg", "height": "90 deg", "samples": [5, 7]})
    assert field_samples(field).solid_angles.sum() == pytest.approx(4.0 * math.pi / 6.0, rel=1e-14)


@given(signal=RATES, other=st.floats(0.0, 1e8), variance=st.floats(0.0, 1e8), ratio=st.floats(1e-2, 1e4))
@UNTIMED
def test_ratio_and_exposure_are_inverse(signal, other, variance, ratio):
    s, b = np.array([signal]), np.array([other])
    exposure = exposure_for(ratio, s, b, variance)
    assert signal_to_noise(s, b, exposure, variance)[0] == pytest.approx(ratio, rel=1e-9)


def test_without_signal_no_exposure_is_long_enough():
    nothing, other = np.zeros(1), np.full(1, 5.0)
    assert exposure_for(10.0, nothing, other, 4.0)[0] == np.inf
    assert signal_to_noise(nothing, other, 10.0, 4.0)[0] == 0.0
    assert signal_to_noise(nothing, nothing, 10.0, 0.0)[0] == 0.0


@given(signal=st.floats(1e-3, 1e6), other=st.floats(0.0, 1e6), variance=st.floats(0.0, 1e6))
@UNTIMED
def test_error_of_the_ratio_is_its_slope_times_the_error_of_the_signal(signal, other, variance):
    s, b, step = np.array([signal]), np.array([other]), 1e-4 * signal
    up, down = (signal_to_noise(s + sign * step, b, 7.0, variance) for sign in (1.0, -1.0))
    error = signal_to_noise_error(s, np.array([0.1 * signal]), b, 7.0, variance)
    assert error[0] == pytest.approx(0.1 * signal * (up[0] - down[0]) / (2.0 * step), rel=1e-6)
