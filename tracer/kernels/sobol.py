"""Points of a Sobol sequence from its direction numbers."""

from tracer.kernels.compiling import allocating_kernel


@allocating_kernel
def sobol_digits(directions, shift, first, digits):
    """Fill `digits` (n, d) with points number `first`, `first` + 1, ... of a shifted sequence, uint64.

    `directions` (d, bits) and `shift` (d,) are uint64. Points come in Gray code order, each one direction number
    away from the one before (Antonov & Saleev 1979, USSR Comput. Math. Math. Phys. 19, 252: memory).
    """
    for k in range(digits.shape[1]):
        point = shift[k]
        gray = first ^ (first >> 1)
        for bit in range(directions.shape[1]):
            if (gray >> bit) & 1:
                point ^= directions[k, bit]
        for i in range(digits.shape[0]):
            digits[i, k] = point
            number = first + i + 1
            bit = 0
            while not number & 1:
                number >>= 1
                bit += 1
            point ^= directions[k, min(bit, directions.shape[1] - 1)]
