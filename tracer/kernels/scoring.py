"""Where a weighted sample or event is counted."""

import math
from typing import NamedTuple

import numpy as np

from tracer.kernels.cells import (
    altitude_cell,
    image_pixel,
    latitude_cell,
    local_time_cell,
    recession,
    velocity_bin,
)
from tracer.kernels.compiling import inlined, kernel, merged
from tracer.kernels.lines import beyond_tables, line_value


class Tally(NamedTuple):
    """Views into one batch's counts; weights are [s-1], samples weight times time [atoms].

    `gas` (altitude, latitude, local_time, 1 + lines) and `pixels` (pixel, 1 + lines), flat over all image planes, hold
    samples and, behind them, samples times the photons a second scattered in each line: side by side, since a sample
    adds to all of them. `column_content` (latitude, local_time) holds samples scaled by (R/r)^2, `velocity_content`
    what image planes resolved by velocity keep (see `cells.Velocities`), flat over them, `velocity_emission` (line, as
    `velocity_content`) the same times photons, `ionized` (altitude, latitude, local_time) samples times the rate of
    ionisation. Fluxes (latitude, local_time), `ledger` (fate) and `launches` hold weights, `adsorbed` (latitude,
    local_time) weight times time at rest, without cells where no atom rests; `roulette` the weight that roulette added,
    `life` weight times survival time, `beyond` samples beyond the end of a line's table; `struck` the weight that hit
    the host, without an entry where there is none. Where the body moves, `aloft` holds all samples, and `older` weight
    times survival time behind the limit of age.
    """

    gas: np.ndarray
    column_content: np.ndarray
    pixels: np.ndarray
    velocity_content: np.ndarray
    velocity_emission: np.ndarray
    ionized: np.ndarray
    released: np.ndarray
    returned: np.ndarray
    captured: np.ndarray
    escaped: np.ndarray
    escaped_by_direction: np.ndarray
    adsorbed: np.ndarray
    ledger: np.ndarray
    launches: np.ndarray
    roulette: np.ndarray
    beyond: np.ndarray
    life: np.ndarray
    aloft: np.ndarray
    older: np.ndarray
    struck: np.ndarray

    @property
    def content(self) -> np.ndarray:
        """Samples in the cells, (altitude, latitude, local_time), a view."""
        return self.gas[..., 0]

    @property
    def emission(self) -> np.ndarray:
        """Samples in the cells times scattered photons a second, (line, altitude, latitude, local_time), a view."""
        return np.moveaxis(self.gas[..., 1:], -1, 0)

    @property
    def image_content(self) -> np.ndarray:
        """Samples in the pixels, (pixel,), a view."""
        return self.pixels[:, 0]

    @property
    def image_emission(self) -> np.ndarray:
        """Samples in the pixels times scattered photons a second, (line, pixel), a view."""
        return self.pixels[:, 1:].T


@merged
def ground_cell(cells, x, y, z, r):
    """Return (latitude cell, local-time cell) of position (x, y, z) at distance `r` from the centre."""
    return latitude_cell(cells, z / r), local_time_cell(cells, x, y)


@merged
def score_sample(tally, cells, images, x, y, z, r, velocity, content, ionizing, shine):
    """Count `content` atoms at (x, y, z) [m] in density, vertical column, images and what sunlight does to them.

    `velocity` (vx, vy, vz) [m s-1] in the Sun-fixed frame is not looked at unless an image is resolved by velocity.
    `ionizing` [s-1] is their rate of ionisation there, `shine` (line,) [s-1] the photons that each scatters.
    """
    layer = altitude_cell(cells, r)
    if layer >= 0:
        row, column = ground_cell(cells, x, y, z, r)
        at_ground = scaled_to_ground(cells.radius, r, content)
        count_in_cell(tally, layer, row, column, content, at_ground, ionizing, shine)
    count_in_images(tally, images, cells.radius, x, y, z, velocity, content, shine)


@inlined
def score_in_light(world, tally, x, y, z, velocity, content, received, receding, shine):
    """Count `content` atoms that receive so much light and recede from the Sun at `receding` [m s-1].

    `received` is relative to full light at `light_distance`; `shine` (line,) is room for each line's photons.
    """
    tables = world.light.line_tables
    for line in range(shine.shape[0]):
        shine[line] = received * line_value(tables, line, receding)
    if beyond_tables(tables, receding):
        tally.beyond[0] += content
    r = math.sqrt(x * x + y * y + z * z)
    ionizing = received * world.light.conditions.sky.losses.ionizing
    score_sample(tally, world.cells, world.images, x, y, z, r, velocity, content, ionizing, shine)


@inlined
def scaled_to_ground(radius, r, content):
    """Return `content` at distance `r` [m] times (R/r)^2, as it counts above ground at `radius` R [m]."""
    shrink = radius / r
    return content * shrink * shrink


@merged
def count_in_cell(tally, layer, row, column, content, at_ground, ionizing, shine):
    """Count `content` atoms in a cell of the grid, and `at_ground` of `scaled_to_ground` in its column."""
    tally.gas[layer, row, column, 0] += content
    tally.column_content[row, column] += at_ground
    if ionizing > 0.0:
        tally.ionized[layer, row, column] += content * ionizing
    for line in range(shine.shape[0]):
        tally.gas[layer, row, column, 1 + line] += content * shine[line]


@merged
def count_in_images(tally, images, radius, x, y, z, velocity, content, shine):
    """Count `content` atoms at (x, y, z) [m] with `velocity` [m s-1] in the Sun-fixed frame in all images."""
    for i in range(images.first.shape[0]):
        pixel = image_pixel(images, i, radius, x, y, z)
        if pixel >= 0:
            tally.pixels[pixel, 0] += content
            for line in range(shine.shape[0]):
                tally.pixels[pixel, 1 + line] += content * shine[line]
            if images.velocities.bins[i] > 0:
                away = recession(images, i, x, y, velocity)
                pixels = images.rows[i] * images.columns[i]
                count_velocity(
                    tally.velocity_content,
                    tally.velocity_emission,
                    images.velocities,
                    i,
                    pixel - images.first[i],
                    pixels,
                    away,
                    content,
                    shine,
                )


@kernel
def count_velocity(counts, emissions, velocities, i, pixel, pixels, away, content, shine):
    """Count `content` atoms that recede at `away` [m s-1] in a `pixel` of plane `i`, which has so many `pixels`.

    `counts` and `emissions` are the fields `velocity_content` and `velocity_emission` of a `Tally`.

    Beside the bins their sums of first and second powers, from the middle of the bins, so that few digits cancel in the
    mean and the width.
    """
    bins, offset = velocities.bins[i], away - velocities.middle[i]
    first = velocities.first[i] + pixel
    counted = first + velocity_bin(velocities, i, away) * pixels
    linear = first + (bins + 1) * pixels
    square = linear + pixels
    counts[counted] += content
    counts[linear] += content * offset
    counts[square] += content * offset * offset
    for line in range(shine.shape[0]):
        photons = content * shine[line]
        emissions[line, counted] += photons
        emissions[line, linear] += photons * offset
        emissions[line, square] += photons * offset * offset


@kernel
def mean_survival_time(hazard, duration):
    """Return the integral [s] of exp(-hazard t) over `duration` [s], for a constant `hazard` [s-1]."""
    if hazard == 0.0:
        return duration
    return -math.expm1(-hazard * duration) / hazard
