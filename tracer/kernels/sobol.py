"""Points of a Sobol sequence from its direction numbers."""

import numpy as np

from tracer.kernels.compiling import allocating_kernel, kernel


@allocating_kernel
def sobol_digits(directions, shift, numbers):
    """Return points number `numbers` (n,) of a shifted sequence, uint64 (n, d).

    `directions` (d, bits) and `shift` (d,) are uint64, `numbers` int64. Points come in Gray code order, each one
    direction number away from the one before (Antonov & Saleev 1979, USSR Comput. Math. Math. Phys. 19, 252: memory).
    """
    digits = np.empty((numbers.shape[0], directions.shape[0]), np.uint64)
    for i in range(numbers.shape[0]):
        number = numbers[i]
        follows = i > 0 and number == numbers[i - 1] + 1
        if follows:
            bit = 0
            while not (number >> bit) & 1:
                bit += 1
            for k in range(directions.shape[0]):
                digits[i, k] = digits[i - 1, k] ^ directions[k, bit]
        else:
            for k in range(directions.shape[0]):
                digits[i, k] = _point(directions[k], shift[k], number ^ (number >> 1))
    return digits


@kernel
def _point(directions, shift, gray):
    point = shift
    bit = 0
    while gray:
        if gray & 1:
            point ^= directions[bit]
        gray >>= 1
        bit += 1
    return point
