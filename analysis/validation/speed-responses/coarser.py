"""A product's responses in bins four times as wide: what widths do, with the same launches, without their noise."""

import numpy as np
import xarray as xr

from tracer.observe.responses import BIAS, evaluate_law, speed_edges
from tracer.product.layout import BOUNDS, LAUNCH_SPEED, ORDER, REPLICATES

TIMES = 4


def coarser(product: xr.Dataset) -> xr.Dataset:
    """Return a product with `TIMES` bins in one, on either side of the escape speed from the slowest on.

    R0 and R1 of a wide bin follow exactly from those of its parts: with half width h and middle m of a part, H and M of
    the whole, R0 is the sum of (h/H) r0 and R1 that of (h/H) ((m - M)/H r0 + (h/H) r1).
    """
    edges = speed_edges(product)
    escape = int(np.argmin(np.abs(edges - float(product.attrs["escape_speed"]))))
    kept = np.unique([*range(0, escape, TIMES), *range(escape, len(edges) - 1, TIMES), len(edges) - 1])
    wide = edges[kept]
    middle, half = 0.5 * (edges[1:] + edges[:-1]), 0.5 * np.diff(edges)
    place = np.searchsorted(kept, np.arange(len(middle)), side="right") - 1
    centre, reach = (0.5 * (wide[1:] + wide[:-1]))[place], (0.5 * np.diff(wide))[place]
    matrix = np.zeros((len(wide) - 1, 2, len(middle), 2))
    parts = np.arange(len(middle))
    matrix[place, 0, parts, 0] = half / reach
    matrix[place, 1, parts, 0] = half / reach * (middle - centre) / reach
    matrix[place, 1, parts, 1] = (half / reach) ** 2
    names = [
        str(name)
        for name, one in product.data_vars.items()
        if LAUNCH_SPEED in one.dims
        and ORDER in one.dims
        and (name + REPLICATES in product or REPLICATES in str(name))
    ]
    found = product.drop_dims(LAUNCH_SPEED)
    for name in names:
        one = product[name]
        whole = np.tensordot(matrix, one.transpose(LAUNCH_SPEED, ORDER, ...).values, 2)
        axes = [axis for axis in one.dims if axis not in (LAUNCH_SPEED, ORDER)]
        found[name] = xr.DataArray(whole, dims=(LAUNCH_SPEED, ORDER, *axes), attrs=one.attrs)
    found[LAUNCH_SPEED + BOUNDS] = xr.DataArray(
        np.stack([wide[:-1], wide[1:]], axis=1), dims=(LAUNCH_SPEED, "bounds")
    )
    return found


def against_fine(product: xr.Dataset, law: dict[str, str], names: tuple[str, ...]) -> dict[str, float]:
    """Return how the same launches differ in wide and in fine bins, in numbers that either has.

    `numbers` of them; `held` is the share in which the difference is at most the bound for the wide bins, `held_error`
    that in which it is at most the stated error, and `worst` the greatest difference over that error.
    """
    fine, wide = (evaluate_law(one, 0, law) for one in (product, coarser(product)))
    away, bound, error = [], [], []
    for name in names:
        if name in fine:
            known = np.isfinite(wide[name + "_standard_error"].values) & (fine[name].values != 0.0)
            away.append(np.abs(wide[name].values - fine[name].values)[known])
            bound.append(wide[name + BIAS].values[known])
            error.append(wide[name + "_standard_error"].values[known])
    away, bound, error = (np.concatenate(one) for one in (away, bound, error))
    return {
        "numbers": len(away),
        "held": float(np.mean(away <= bound)),
        "held_error": float(np.mean(away <= error)),
        "worst": float(np.max(away / error)),
        "median": float(np.median(away / error)),
        "bound": float(np.median(bound / error)),
    }
