"""Points of a Sobol sequence from its direction numbers."""

import numpy as np

from tracer.kernels.compiling import allocating_kernel, kernel

BITS = 53
"""Binary digits of a point, as many as a float64 holds."""

PER_UNIT = 0.5**BITS


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


@allocating_kernel
def sobol_in_boxes(directions, shift, low, width, counts, first, count):
    """Return points `first` to `first` + `count` - 1 of boxes, box by box, (d, count).

    Boxes of the unit cube begin at `low` (m, d), are `width` (m, d) wide and have `counts` (m,) points. Those of a box
    are a run of the sequence (see `sobol_digits`) that begins at a multiple of the power of 2 that holds it.
    """
    result = np.empty((directions.shape[0], count))
    begin, run = 0, 0
    for box in range(counts.shape[0]):
        size = 1
        while size < counts[box]:
            size *= 2
        run = (run + size - 1) // size * size
        start, stop = max(first, begin), min(first + count, begin + counts[box])
        for k in range(directions.shape[0]):
            own, found = directions[k], result[k]
            number = run + start - begin
            digits = _point(own, shift[k], number ^ (number >> 1))
            edge, length = low[box, k], width[box, k]
            for i in range(start - first, stop - first):
                # Whole numbers with a sign become floats in one operation.
                found[i] = edge + length * (np.int64(digits) * PER_UNIT)
                number += 1
                # The exponent of a power of 2, without a branch. Were it signed, it might count from the end.
                bit = np.uint64((np.float64(number & -number).view(np.int64) >> 52) - 0x3FF)
                digits ^= own[bit]
        begin += counts[box]
        run += counts[box]
    return result


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
