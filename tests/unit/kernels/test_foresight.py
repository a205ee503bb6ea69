"""Asking for memory early changes nothing."""

import numpy as np
import pytest

from tracer.kernels.compiling import kernel
from tracer.kernels.foresight import fetch_early


@kernel
def _fetch(array, row, column):
    fetch_early(array, (row, column))


@pytest.mark.parametrize("array", [np.arange(12.0).reshape(3, 4), np.arange(24.0).reshape(3, 8)[:, ::2]])
def test_fetching_early_leaves_numbers_as_they_are(array):
    before = array.copy()
    for row in range(3):
        for column in range(4):
            _fetch(array, row, column)
            _fetch.py_func(array, row, column)
    np.testing.assert_array_equal(array, before)
