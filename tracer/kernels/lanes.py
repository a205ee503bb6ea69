"""Flights side by side: one flat float64 array that holds each number of all flights in progress in a row.

Row after row of `WIDTH` numbers, one for each lane; the names below are where the first row of a kind begins. Loops
over lanes that do the same arithmetic on each become vector operations: several flights for the price of one.
"""

from itertools import accumulate

import numpy as np

from tracer.kernels.orbit import SERIES_SIZE

WIDTH = 32
"""Number of lanes; known when a loop is compiled, and large enough not to be unrolled before it is vectorised."""

Y, Z = WIDTH, 2 * WIDTH
"""From the row of a vector's x to those of its y and z."""

VELOCITY, ACCELERATION, LIGHT, OTHER, NEARNESS = (rows * WIDTH for rows in (3, 6, 9, 10, 11))
"""From the row of a state's x to those of its vx, its ax, the light received, the rate of other losses, and 1/r."""

STATE_ROWS = 12

STAGE_ACCELERATION, STAGE_LIGHT, STAGE_OTHER = (rows * WIDTH for rows in (3, 6, 7))
"""From the row of a stage's vx to those of its ax, its light and its other losses."""

STAGE_ROWS = 8

HOP_ROWS = 17

MOST_GRIDS = 2
"""Tables of pushing lines that all lanes look up at once; the push of further ones is added lane by lane."""

_ROWS = (
    # The flight as it stands, and as it will after the step that was tried.
    ("START", STATE_ROWS),
    ("END", STATE_ROWS),
    # Time since launch [s] and its limit, the next step [s], the step before the present zone, the zone, the number of
    # trial steps, how the flight stands.
    ("TIME", 1),
    ("TIME_LIMIT", 1),
    ("STEP", 1),
    ("OPEN_STEP", 1),
    ("ZONE", 1),
    ("TRIALS", 1),
    ("STANDING", 1),
    # What a squared error is multiplied by before the scales, the weight [s-1] at launch, the part that survives.
    ("PER_ALLOWED", 1),
    ("ALIVE", 1),
    ("KEPT", 1),
    # The part below which roulette is played.
    ("LEAST", 1),
    # The step that was tried: its length [s]; 1 where only part of the Sun is seen; the part that is; the push of lines
    # beyond the first tables [m s-2]; 1 where age ends it, where it is accepted, where it needs a closer look; the
    # factor to the next; the square of its error over what is allowed; the part of it that is flown.
    ("LENGTH", 1),
    ("PARTIAL", 1),
    ("LIT", 1),
    ("EXTRA", 1),
    ("LAST", 1),
    ("ACCEPTED", 1),
    ("FLAGGED", 1),
    ("CHANGE", 1),
    ("ERROR_SQUARED", 1),
    ("FLOWN", 1),
    # Lanes that are looked at one by one, in each stage or after it, as many as there are.
    ("APART", 1),
    # Its stages: velocity, acceleration, light and other losses.
    ("SECOND", STAGE_ROWS),
    ("THIRD", STAGE_ROWS),
    ("FOURTH", STAGE_ROWS),
    ("FIFTH", STAGE_ROWS),
    ("SIXTH", STAGE_ROWS),
    ("SEVENTH", STAGE_ROWS),
    # A stage: its place; 1/r^3 [m-3], 1/s^2 [m-2], 1/s [m-1], s the distance from the Sun; for each table of pushing
    # lines how many steps from its first knot, the bits of the straight line's entry, and the push.
    ("PLACE", 3),
    ("PER_R3", 1),
    ("PER_S2", 1),
    ("PER_S", 1),
    ("LINE_STEP", MOST_GRIDS),
    ("LINE_ENTRY", MOST_GRIDS),
    ("LINE_PUSH", MOST_GRIDS),
    # Growth of place, velocity and the integrals of light and other losses over the whole step; the quartic
    # coefficients of the same.
    ("GROWTH", STAGE_ROWS),
    ("QUARTIC", STAGE_ROWS),
    # The error of the other losses; stays 0, as do their growth and quartic coefficient, where they don't vary.
    ("OTHER_ERROR", 1),
    # How many samples the step is worth; the weight at its start [s-1].
    ("SAMPLES", 1),
    ("WEIGHT", 1),
    # The first sample: its place in the first even part of the step, from 0 to 1, which further samples have in theirs,
    # even and random; place; distance from the centre; atoms; light received; radial velocity from the Sun; the cells,
    # counted with fractions.
    ("DRAWN", 1),
    ("SAMPLE", 3),
    ("SAMPLE_R", 1),
    ("CONTENT", 1),
    ("RECEIVED", 1),
    ("RECEDING", 1),
    ("LAYER", 1),
    ("ROW", 1),
    ("COLUMN", 1),
    # The cell's numbers; the first is -1 above the grid.
    ("CELL", 3),
    # What the flown part leaves in the budget: what is lost and how much of that is ionised [s-1], survival times time.
    ("LOST", 1),
    ("IONIZED", 1),
    ("LIFE", 1),
    # The same summed over accepted steps, entered in the budget when all flights have ended; the number of the steps,
    # counted at the end of a slice.
    ("SUM_LOST", 1),
    ("SUM_IONIZED", 1),
    ("SUM_LIFE", 1),
    ("SUM_STEPS", 1),
    # Where the body moves: the series of its distance about the step's start, and the host's phase there.
    ("SERIES", SERIES_SIZE),
    # The sample's velocity in the Sun-fixed frame.
    ("SAMPLE_VELOCITY", 3),
    # Where there is a host: how the step lies in its shadow, and the longest step [s] beside it.
    ("SHADE", 1),
    ("HOST_STEP", 1),
    # A closed hop and its samples, see `hop_lanes`.
    ("HOP", HOP_ROWS),
)
_FIRST = dict(
    zip(
        (name for name, _ in _ROWS),
        accumulate((WIDTH * count for _, count in _ROWS), initial=0),
        strict=False,
    )
)
LANES_SIZE = WIDTH * sum(count for _, count in _ROWS)

START = _FIRST["START"]
END = _FIRST["END"]
TIME = _FIRST["TIME"]
TIME_LIMIT = _FIRST["TIME_LIMIT"]
STEP = _FIRST["STEP"]
OPEN_STEP = _FIRST["OPEN_STEP"]
ZONE = _FIRST["ZONE"]
TRIALS = _FIRST["TRIALS"]
STANDING = _FIRST["STANDING"]
PER_ALLOWED = _FIRST["PER_ALLOWED"]
ALIVE = _FIRST["ALIVE"]
KEPT = _FIRST["KEPT"]
LEAST = _FIRST["LEAST"]
LENGTH = _FIRST["LENGTH"]
PARTIAL = _FIRST["PARTIAL"]
LIT = _FIRST["LIT"]
EXTRA = _FIRST["EXTRA"]
LAST = _FIRST["LAST"]
ACCEPTED = _FIRST["ACCEPTED"]
FLAGGED = _FIRST["FLAGGED"]
CHANGE = _FIRST["CHANGE"]
ERROR_SQUARED = _FIRST["ERROR_SQUARED"]
FLOWN = _FIRST["FLOWN"]
APART = _FIRST["APART"]
SECOND = _FIRST["SECOND"]
THIRD = _FIRST["THIRD"]
FOURTH = _FIRST["FOURTH"]
FIFTH = _FIRST["FIFTH"]
SIXTH = _FIRST["SIXTH"]
SEVENTH = _FIRST["SEVENTH"]
PLACE = _FIRST["PLACE"]
PER_R3 = _FIRST["PER_R3"]
PER_S2 = _FIRST["PER_S2"]
PER_S = _FIRST["PER_S"]
LINE_STEP = _FIRST["LINE_STEP"]
LINE_ENTRY = _FIRST["LINE_ENTRY"]
LINE_PUSH = _FIRST["LINE_PUSH"]
GROWTH = _FIRST["GROWTH"]
QUARTIC = _FIRST["QUARTIC"]
OTHER_ERROR = _FIRST["OTHER_ERROR"]
SAMPLES = _FIRST["SAMPLES"]
WEIGHT = _FIRST["WEIGHT"]
DRAWN = _FIRST["DRAWN"]
SAMPLE = _FIRST["SAMPLE"]
SAMPLE_R = _FIRST["SAMPLE_R"]
CONTENT = _FIRST["CONTENT"]
RECEIVED = _FIRST["RECEIVED"]
RECEDING = _FIRST["RECEDING"]
LAYER = _FIRST["LAYER"]
ROW = _FIRST["ROW"]
COLUMN = _FIRST["COLUMN"]
CELL = _FIRST["CELL"]
LOST = _FIRST["LOST"]
IONIZED = _FIRST["IONIZED"]
LIFE = _FIRST["LIFE"]
SUM_LOST = _FIRST["SUM_LOST"]
SUM_IONIZED = _FIRST["SUM_IONIZED"]
SUM_LIFE = _FIRST["SUM_LIFE"]
SUM_STEPS = _FIRST["SUM_STEPS"]
SERIES = _FIRST["SERIES"]
SAMPLE_VELOCITY = _FIRST["SAMPLE_VELOCITY"]
SHADE = _FIRST["SHADE"]
HOST_STEP = _FIRST["HOST_STEP"]
HOP = _FIRST["HOP"]

VACANT = -2.0
"""Standing of a lane without a flight."""

UNDRAWN = -1.0
"""In row DRAWN before a lane's first flight."""


def new_lanes() -> np.ndarray:
    """Return lanes without flights, their numbers such as no formula stumbles over."""
    lanes = np.ones(LANES_SIZE)
    lanes[STANDING : STANDING + WIDTH] = VACANT
    pushes = [LINE_PUSH + line * WIDTH for line in range(MOST_GRIDS)]
    others = [GROWTH + STAGE_OTHER, QUARTIC + STAGE_OTHER, OTHER_ERROR]
    lanes[DRAWN : DRAWN + WIDTH] = UNDRAWN
    for first in [EXTRA, *pushes, *others, SUM_LIFE, SUM_LOST, SUM_IONIZED, SUM_STEPS]:
        lanes[first : first + WIDTH] = 0.0
    return lanes
