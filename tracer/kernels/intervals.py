"""In which intervals between rising edges numbers lie."""

from tracer.kernels.compiling import inlined


@inlined
def find_intervals(edges, intervals, values, begins):
    """Move each of `begins` (n,) to the last interval that doesn't begin above its value of `values` (n,).

    At first it is where in `edges` a row of `intervals` + 1 rising edges begins, in which to look; it stays there where
    all begin above. Halving goes on for all values in turn: for one alone each look would wait for the one before.
    """
    while intervals > 1:
        half = intervals >> 1
        for i in range(values.shape[0]):
            begins[i] += half if edges[begins[i] + half] <= values[i] else 0
        intervals -= half
