"""What a field of view sees: means over lines of sight that sample it."""

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np

from tracer.constants import RAYLEIGH
from tracer.observe.gas import Gas
from tracer.observe.integration import BLOCK, integrals_along
from tracer.observe.optical_depth import optical_depth
from tracer.observe.path import ObserverPath
from tracer.observe.planspec.spectrometer import SpectrometerTable
from tracer.observe.pointing import Attitude, directions, field_samples
from tracer.observe.sightlines import doppler_speeds
from tracer.observe.sights import Floats, Sights, share_outside
from tracer.units import si


class Light(NamedTuple):
    """What the field of view sees at N exposures, means over the field.

    `column` (N,) and its replicates (N, G) [m-2]; `brightness` (N, L) and replicates (N, L, G) in rayleigh; `missing`
    (N,) the estimated part of the column above the grid's top, 1 where the field misses the grid; `depth` (N,) the
    largest optical depth of any line in the field.
    """

    column: Floats
    column_replicates: Floats
    brightness: Floats
    brightness_replicates: Floats
    missing: Floats
    depth: Floats


def field_light(gas: Gas, path: ObserverPath, stand: Attitude, instrument: SpectrometerTable) -> Light:
    """Return what the field of view sees at every place of the path."""
    parts = [_light_of(gas, sights, weights) for sights, weights in _field_blocks(path, stand, instrument)]
    return Light(*(np.concatenate([part[i] for part in parts]) for i in range(len(Light._fields))))


def _field_blocks(
    path: ObserverPath, stand: Attitude, instrument: SpectrometerTable
) -> Iterator[tuple[Sights, Floats]]:
    """Yield the lines of sight of some exposures at a time, all samples of one after another, and their weights."""
    field = instrument.field_of_view
    samples = field_samples(field)
    weights = samples.solid_angles / samples.solid_angles.sum()
    rows = max(1, BLOCK // len(weights))
    for first in range(0, len(path.places), rows):
        some = slice(first, first + rows)
        looks = directions(Attitude(*(part[some] for part in stand)), samples, si(field.roll))
        starts = np.repeat(path.places[some], len(weights), axis=0)
        yield Sights(starts, looks.reshape(-1, 3)), weights


def _light_of(gas: Gas, sights: Sights, weights: Floats) -> Light:
    found = integrals_along(gas, sights)
    count = len(weights)

    def mean(values: Floats) -> Floats:
        """Return the mean over the field of values (N x M, ...)."""
        return np.asarray(
            np.tensordot(values.reshape(-1, count, *values.shape[1:]), weights, axes=([1], [0]))
        )

    column = found.column.sum(axis=1)
    speeds = doppler_speeds(gas, None)
    depths = [optical_depth(found.column, line, speeds).sum(axis=1) for line in gas.line_facts]
    depth = np.max(np.nan_to_num(np.array(depths)), axis=0).reshape(-1, count).max(axis=1)
    inside, beyond = mean(column), mean(found.beyond)
    missed = share_outside(sights, gas.radius, gas.top_radius, gas.traced_radius) >= 1.0
    known = inside + beyond
    missing = np.divide(beyond, known, out=np.zeros_like(known), where=known > 0.0)
    return Light(
        column=inside,
        column_replicates=mean(found.column_replicates.sum(axis=1)),
        brightness=mean(found.photons.sum(axis=2)) / RAYLEIGH,
        brightness_replicates=mean(found.photon_replicates.sum(axis=2)) / RAYLEIGH,
        missing=np.where(missed.reshape(-1, count).all(axis=1), 1.0, missing),
        depth=depth,
    )
