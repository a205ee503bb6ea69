"""How much of an image the bins of velocity leave out."""

from collections.abc import Iterator

import numpy as np
import xarray as xr

from tracer.product.layout import resolved_images

NOTABLE = 0.01
"""Share of an image's atoms outside its bins of velocity that is worth a word."""


def outside_notes(ds: xr.Dataset) -> Iterator[str]:
    """Yield, without a full stop, for which images of a product more than `NOTABLE` lies outside the bins."""
    for name in resolved_images(ds.dims):
        share = outside_share(ds, name)
        if share > NOTABLE:
            yield (
                f"image {name}: {100.0 * share:.3g} % of its atoms are slower or faster than all bins of velocity; "
                "they count in the plain image, in means and widths, and in no line profile"
            )


def outside_share(ds: xr.Dataset, image: str) -> float:
    """Return the share of an image's atoms, of all releases, outside its bins; 0 where there are no atoms."""
    outside = ds[f"column_outside_velocity_{image}"].values
    largest = float(np.max(outside, initial=0.0))
    if not largest > 0.0:
        return 0.0
    # Scaled first: sums of large columns might overflow.
    return float(np.sum(outside / largest) / np.sum(ds[f"column_{image}"].values / largest))
