"""How a variable lies in its file: chunks that are contiguous in memory order, one after the other."""

from collections.abc import Iterator
from itertools import product

CHUNK_BYTES = 2**20
"""Size that a chunk may have: read and written whole, it bounds what streaming a variable holds at a time."""


def chunk_shape(shape: tuple[int, ...], itemsize: int) -> tuple[int, ...]:
    """Return the chunk of an array of `shape`: trailing axes whole as far as they fit, leading ones cut to 1.

    So at most one axis is cut elsewhere, and the chunks in their order are the array in C order.
    """
    room = max(1, CHUNK_BYTES // itemsize)
    chunk: list[int] = []
    for size in reversed(shape):
        taken = max(1, min(size, room))
        # Behind an axis that is cut no other may be whole, or chunks would not follow each other in memory order.
        room = room // taken if taken == size else 1
        chunk.append(taken)
    return tuple(reversed(chunk))


def slabs(shape: tuple[int, ...], itemsize: int) -> Iterator[tuple[slice, ...]]:
    """Yield the chunks of an array in C order, as slices along each axis."""
    chunk = chunk_shape(shape, itemsize)
    starts = [range(0, size, step) for size, step in zip(shape, chunk, strict=True)]
    for corner in product(*starts):
        yield tuple(
            slice(start, min(start + step, size))
            for start, step, size in zip(corner, chunk, shape, strict=True)
        )
