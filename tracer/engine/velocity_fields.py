"""Means and widths of the velocity in images, of all releases, with errors from the replicates."""

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from tracer.engine.folding import Folder
from tracer.kernels.scoring import Tally
from tracer.product.layout import Ratio, ratio_names
from tracer.tally.axes import ImagePlane
from tracer.tally.buffer import tally_views
from tracer.tally.field import FieldStatistics
from tracer.tally.plane_moments import plane_moments
from tracer.tally.statistics import replicate_counts
from tracer.tally.velocity_moments import Moments, jackknife_errors

Numbers = NDArray[np.float64]


def velocity_fields(
    planes: Sequence[ImagePlane], folder: Folder, tallied: Mapping[str, FieldStatistics]
) -> dict[str, FieldStatistics]:
    """Return mean and width of the velocity in each image that is resolved by it, by the name in the product.

    Parameters
    ----------
    planes : sequence of ImagePlane
        All images.
    folder : Folder
        The folded batches.
    tallied : mapping of str to FieldStatistics
        What the moments are weighted with: columns and brightness of the images, with their replicates.

    Returns
    -------
    dict of str to FieldStatistics
        [m s-1]; errors as `tally.velocity_moments.jackknife_errors` has them, NaN without replicates.
    """
    resolved = [plane for plane in planes if plane.velocity_edges is not None]
    if not resolved:
        return {}
    layout, statistics = folder.layout, folder.statistics
    releases, groups = len(statistics), statistics[0].groups
    means: dict[str, Numbers] = {}
    replicates: dict[str, NDArray[np.float32]] = {}
    whole = np.zeros(layout.size)
    for number, one in enumerate(statistics):
        for name, values in _moments(tally_views(layout, one.mean), planes).items():
            means.setdefault(name, np.empty(_shape(values, releases)))[_place(values, number)] = values
        for group, row in enumerate(one.replicate_means()):
            whole[: layout.replicated_size] = row
            for name, values in _moments(tally_views(layout, whole), planes).items():
                made = replicates.setdefault(name, np.empty((groups, *_shape(values, releases)), np.float32))
                made[group][_place(values, number)] = values
    first = statistics[0]
    counts = replicate_counts(first.first_batch, first.batches, len(first.replicate_sum))
    batches = [count for count in counts if count]
    fields: dict[str, FieldStatistics] = {}
    for plane in resolved:
        for names in (ratio_names(plane.name, by_line) for by_line in (False, True)):
            if names.mean in means:
                fields |= _with_errors(names, means, replicates, batches, tallied[names.weight].replicates)
    return fields


def _moments(tally: Tally, planes: Sequence[ImagePlane]) -> dict[str, Numbers]:
    found: dict[str, Numbers] = {}
    for plane, by_line, moments in plane_moments(tally, planes):
        names = ratio_names(plane.name, by_line)
        found |= {names.mean: moments.mean, names.width: moments.width}
    return found


def _shape(values: Numbers, releases: int) -> tuple[int, ...]:
    """Return the shape over all releases: they stand before the pixels, behind the lines."""
    return (*values.shape[:-2], releases, *values.shape[-2:])


def _place(values: Numbers, number: int) -> tuple[slice | int, ...]:
    return (*(slice(None),) * (values.ndim - 2), number)


def _with_errors(
    names: Ratio,
    means: Mapping[str, Numbers],
    replicates: Mapping[str, NDArray[np.float32]],
    batches: Sequence[int],
    weights: NDArray[np.floating] | None,
) -> dict[str, FieldStatistics]:
    chosen = (names.mean, names.width)
    errors = {name: np.full_like(means[name], np.nan) for name in chosen}
    if weights is not None:
        for place in np.ndindex(means[names.mean].shape[:-2]):
            parts = [
                Moments(*(one[(group, *place)] for one in (weights, *(replicates[name] for name in chosen))))
                for group in range(len(batches))
            ]
            for name, error in zip(chosen, jackknife_errors(parts, batches), strict=True):
                errors[name][place] = error
    return {name: FieldStatistics(means[name], errors[name], replicates.get(name)) for name in chosen}
