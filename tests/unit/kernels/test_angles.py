"""Angles, sines and cosines without calls are those of the C library, and vector operations in a loop."""

import math
import re

import llvmlite.binding as llvm
import numba
import numpy as np
import pytest

from tracer.kernels.angles import angle_above, sine_and_cosine
from tracer.kernels.compiling import OPTIONS

FEATURES = llvm.get_host_cpu_features()

LAST_PLACE = 2.0**-53
"""Rounding of a number between 1/2 and 1, which the C library's functions keep to nearly."""


def test_angles_above_the_axis_are_right_to_their_last_digits():
    # From nearly along the axis to nearly against it, and about the edges of all parts of the reduction.
    edges = np.arange(1, 16) * math.pi / 16.0
    angles = np.concatenate([np.linspace(1e-3, math.pi, 2_000), np.geomspace(1e-12, 1e-3, 200), edges - 1e-9])
    for angle in angles:
        x, y = 7e7 * math.cos(angle), abs(7e7 * math.sin(angle))
        assert angle_above(x, y) == pytest.approx(math.atan2(y, x), rel=6.0 * LAST_PLACE, abs=0.0)


@pytest.mark.parametrize(
    ("x", "y", "angle"), [(1.0, 0.0, 0.0), (0.0, 2.0, math.pi / 2), (-3.0, 0.0, math.pi)]
)
def test_angles_on_the_axes_are_exact(x, y, angle):
    assert angle_above(x, y) == angle


@pytest.mark.parametrize("largest", [1.0, 20.0, 1e6])
def test_sines_and_cosines_are_right_to_their_last_digits(largest):
    quarters = np.arange(-50, 51) * (math.pi / 2) * round(largest / 100.0 + 0.5)
    angles = np.concatenate([np.random.default_rng(1).uniform(-largest, largest, 1_500), quarters])
    for angle in angles[abs(angles) <= largest]:
        sine, cosine = sine_and_cosine(angle)
        assert sine == pytest.approx(math.sin(angle), rel=0.0, abs=3.0 * LAST_PLACE)
        assert cosine == pytest.approx(math.cos(angle), rel=0.0, abs=3.0 * LAST_PLACE)


@numba.njit(**OPTIONS)
def _all_of_them(x, y, angles, sines, cosines):
    for i in range(x.shape[0]):
        angles[i] = angle_above(x[i], y[i])
        sines[i], cosines[i] = sine_and_cosine(y[i])


@pytest.mark.skipif(not (FEATURES.get("avx2") and FEATURES.get("fma")), reason="needs x86 with AVX2")
def test_a_loop_over_them_is_vector_operations():
    _all_of_them(*(np.ones(8) for _ in range(5)))
    text = next(iter(_all_of_them.inspect_asm().values()))
    assert len(re.findall(r"vdivpd\s.*ymm", text)) >= 1
    assert len(re.findall(r"vfn?m(?:add|sub)\d+pd\s.*ymm", text)) >= 25
