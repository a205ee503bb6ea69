"""What one accepted step of an integrated flight leaves in the cells and in the particle budget."""

import math

from tracer.fate import Fate
from tracer.kernels.compiling import merged
from tracer.kernels.decay import decay
from tracer.kernels.dense_output import CURVE_ZONE, FLOWN, LENGTH, hazards_at, place_at
from tracer.kernels.lines import beyond_tables, line_value
from tracer.kernels.motion import radial_velocity, sunlight_received
from tracer.kernels.scoring import mean_survival_time, score_sample


@merged
def score_step(world, tally, curve, weight, before, shine, rng):
    """Count the flown part of a step by residence time: one sample at an even random time within it.

    The sample stands for weight times survival times the step's duration; `before` is the survival at the step's start,
    `shine` is room for each line's photons.
    """
    part = rng.random() * curve[FLOWN]
    x, y, z, vx, vy, vz = place_at(curve, part)
    ionizing0, other0 = hazards_at(curve, 0.0)
    ionizing, other = hazards_at(curve, part)
    survival = before * decay((ionizing - ionizing0) + (other - other0))
    content = weight * survival * curve[FLOWN] * curve[LENGTH]
    sky, tables = world.light.conditions.sky, world.light.line_tables
    received = sunlight_received(sky, int(curve[CURVE_ZONE]), sky.forces, x, y, z)
    velocity = radial_velocity(sky.forces, x, y, z, vx, vy, vz)
    for line in range(shine.shape[0]):
        shine[line] = received * line_value(tables, line, velocity)
    if beyond_tables(tables, velocity):
        tally.beyond[0] += content
    r = math.sqrt(x * x + y * y + z * z)
    score_sample(tally, world.cells, world.images, x, y, z, r, content, received * sky.losses.ionizing, shine)


@merged
def book_step(tally, curve, weight, before):
    """Enter the flown part of a step into life and ledger and return the survival at its end.

    Survival is integrated, not sampled; `before` is that at the step's start.
    What is lost is shared between ionisation and other losses as their hazards grew; both grow in proportion within a
    step but for the small change of their ratio. The survival time is exact for a hazard that grows evenly, however
    much of it a step holds; Simpson's rule adds what bends it.
    """
    flown = curve[FLOWN]
    ionizing0, other0 = hazards_at(curve, 0.0)
    ionizing1, other1 = hazards_at(curve, flown)
    ionizing, other = hazards_at(curve, 0.5 * flown)
    grown = (ionizing1 - ionizing0) + (other1 - other0)
    after = before * decay(grown)
    middle = before * decay((ionizing - ionizing0) + (other - other0))
    bend = middle - before * decay(0.5 * grown)
    kept = before * mean_survival_time(grown, 1.0) + bend / 1.5
    tally.life[0] += weight * flown * curve[LENGTH] * kept
    lost = weight * (before - after)
    if grown > 0.0:
        share = (ionizing1 - ionizing0) / grown
        tally.ledger[Fate.IONIZED] += lost * share
        tally.ledger[Fate.OTHER_LOSS] += lost * (1.0 - share)
    return after
