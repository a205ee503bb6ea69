import numpy as np
import pytest

from tracer.product import slabs as module
from tracer.product.slabs import chunk_shape, slabs

SHAPES = [(), (1,), (7,), (3, 4), (20, 2, 50, 36, 48), (2, 1, 5, 1), (5000,), (3, 5000, 2)]


@pytest.mark.parametrize("shape", SHAPES, ids=str)
@pytest.mark.parametrize("chunk_bytes", [8, 64, 1000, 2**20])
def test_chunks_in_their_order_are_the_array_in_memory_order(shape, chunk_bytes, monkeypatch):
    monkeypatch.setattr(module, "CHUNK_BYTES", chunk_bytes)
    array = np.arange(np.prod(shape, dtype=int), dtype=np.float64).reshape(shape)
    array = array if array.size < 10_000 or chunk_bytes > 64 else array[:1, :1, :2]
    pieces = [array[place].ravel() for place in slabs(array.shape, 8)]
    assert np.array_equal(np.concatenate(pieces), array.ravel())
    assert max(piece.nbytes for piece in pieces) <= chunk_bytes


def test_a_usual_variable_lies_in_one_chunk_a_release():
    assert chunk_shape((2, 50, 36, 48), 8) == (1, 50, 36, 48)
    assert chunk_shape((1, 1000, 1000, 500), 8) == (1, 1, 262, 500)
