"""`emphasis = "far"`: strata of launches by how far their atoms reach, learnt from a pilot.

The pilot flies a few thousand atoms, one by one, spread over all speeds down to the rarest, and asks of each what it
leaves in shells of distance far from the ground. Boxes of launches are halved where that tells them apart; half of a
batch's launches go to the boxes by their probability, half by what they add to the error far out. Whatever the pilot
finds, the weights are exact: it decides how good the sampling is, never what comes out on average.
"""

from math import ceil, log

import numpy as np
from numpy.typing import NDArray

from tracer.engine.batches import Work, make_work
from tracer.engine.launching import make_launches
from tracer.engine.scene import Release, Scene
from tracer.fate import Fate
from tracer.kernels.launches import Launches
from tracer.kernels.resume import STEPS, new_resume
from tracer.kernels.temperature import temperatures
from tracer.kernels.tracing import trace_slice
from tracer.physics.release.boxes import Sample, halved, importance
from tracer.physics.release.even_numbers import DIMENSIONS, PLACE, SPEED, TURN, EvenNumbers
from tracer.physics.release.strata import Boxes, Strata, one_stratum, shared_out
from tracer.physics.thermal import escape_speed
from tracer.tally.axes import Grid, altitude_edges, latitude_edges, local_time_edges
from tracer.tally.buffer import tally_views

Floats = NDArray[np.float64]

PILOT_ATOMS = 8_192
PILOT_SEED = 20310601
PILOT_FLIGHTS = 1_000
"""Flights after which a pilot's atom is given up: what it still does is no news of its launch."""

PILOT_BUDGET = 200_000
"""Flights after which a pilot ends early: a few seconds. A number of flights, so that it ends everywhere alike."""

LEAST_PILOT_ROUNDS = 32
"""Atoms from each box that are flown at any rate: fewer would not tell how often the rare ones matter."""

SHELLS = 8
NEAREST_SHELL = 0.25
"""Altitude [radii] where far begins."""

RAREST = 1e-12
"""Probability of the fastest launches that are told apart: 1 - u has four digits left."""

SPEED_STEP = 4.0
"""From one stratum of speed to the next the share of launches that are faster falls by this."""

MOST_STRATA = 256
LAUNCHES_PER_STRATUM = 32
EVEN_SHARE = 0.5
"""Share of the launches that goes by probability alone: the variance of anything at most doubles."""


def with_emphasis(work: Work) -> Work:
    """Return `work` with the strata that its scene's emphasis asks for."""
    if work.scene.emphasis == "even":
        return work
    strata = tuple(far_strata(work.scene, release, work.particles) for release in work.scene.releases)
    return work._replace(strata=strata)


def far_strata(scene: Scene, release: Release, particles: int) -> Strata:
    """Return strata for `particles` launches a batch, finer and fuller where atoms reach far."""
    most = min(MOST_STRATA, particles // LAUNCHES_PER_STRATUM)
    edges = speed_edges(rarest_launch(scene, release), most)
    if most < 2:
        return one_stratum(particles)
    boxes = _speed_boxes(edges)
    sample = fly_pilot(scene, release, boxes)
    boxes, wanted = halved(boxes, sample, most)
    shares = EVEN_SHARE * boxes.probabilities + (1.0 - EVEN_SHARE) * wanted
    return Strata(boxes, shared_out(particles, shares))


def rarest_launch(scene: Scene, release: Release) -> float:
    """Return the share of launches that are faster than those still told apart: about that above escape speed.

    The speed is that at the warmest place, where it matters; the share is 1 where slower atoms reach no less far.
    """
    escape = escape_speed(scene.body.gm, scene.body.radius)
    kelvin = _warmest(scene, release)
    if _speed(scene, release, RAREST, kelvin) == _speed(scene, release, 1.0, kelvin):
        return 1.0
    share = 1.0
    while share > RAREST and _speed(scene, release, share, kelvin) < escape:
        share /= SPEED_STEP
    return share


def _speed(scene: Scene, release: Release, share: float, kelvin: Floats) -> float:
    return float(release.speed.speeds(np.array([1.0 - share]), kelvin, scene.mass)[0])


def _warmest(scene: Scene, release: Release) -> Floats:
    law = scene.surface_temperature
    if law is None:
        return np.array([np.nan])
    u = EvenNumbers(np.random.default_rng(PILOT_SEED)).points(np.arange(PILOT_ATOMS))
    places = np.ascontiguousarray(release.place.places(u[:, [PLACE, TURN]]))
    return np.array([temperatures(law, places).max()])


def speed_edges(rarest: float, most: int) -> Floats:
    """Return falling shares of faster launches, from 1 to 0, that bound at most `most` strata of speed."""
    strata = min(ceil(log(1.0 / rarest) / log(SPEED_STEP)), max(0, most - 1))
    return np.append(np.geomspace(1.0, rarest, strata + 1) if strata else [1.0], 0.0)


def _speed_boxes(edges: Floats) -> Boxes:
    low, width = np.zeros((len(edges) - 1, DIMENSIONS)), np.ones((len(edges) - 1, DIMENSIONS))
    low[:, SPEED], width[:, SPEED] = edges[1:], edges[:-1] - edges[1:]
    return Boxes(low, width)


def fly_pilot(scene: Scene, release: Release, boxes: Boxes) -> Sample:
    """Return what atoms from all `boxes` leave far out and what they cost, as many from each box.

    They fly in rounds of one from each box, and no more rounds begin once `PILOT_BUDGET` flights are spent: gas that
    bounces a thousand times would take a minute, and forgets its launch anyway.
    """
    each = PILOT_ATOMS // len(boxes.low)
    box = np.repeat(np.arange(len(boxes.low)), each)
    rng = np.random.default_rng(PILOT_SEED)
    points = EvenNumbers(rng).points(np.arange(len(box)))
    places = boxes.low[box] + boxes.width[box] * points
    u = places.copy()
    u[:, SPEED] = np.minimum(1.0 - u[:, SPEED], np.nextafter(1.0, 0.0))
    launches = make_launches(scene, release, u, np.ones(len(box)))
    work = make_work(scene._replace(grid=_shells(scene), planes=(), speed_bins=0), PILOT_SEED, 1)
    scores = np.empty((len(box), SHELLS + 1))
    costs = np.empty(len(box))
    flown, spent = 0, 0
    while flown < each and (flown < LEAST_PILOT_ROUNDS or spent < PILOT_BUDGET):
        for i in range(flown, len(box), each):
            launch = Launches(*(array[i : i + 1] for array in launches))
            scores[i], costs[i], flights = _fly_alone(work, launch, rng)
            spent += flights
        flown += 1
    done = np.flatnonzero(np.arange(len(box)) % each < flown)
    box, scores = box[done], scores[done]
    return Sample(box, points[done], importance(scores, boxes.probabilities[box] / flown), costs[done])


def _shells(scene: Scene) -> Grid:
    radius = scene.body.radius
    top = scene.outer_radius - radius
    first = min(NEAREST_SHELL * radius, top / 2.0**SHELLS)
    return Grid(radius, altitude_edges(first, top, SHELLS + 1), latitude_edges(1), local_time_edges(1))


def _fly_alone(work: Work, launch: Launches, rng: np.random.Generator) -> tuple[Floats, float, int]:
    """Return what one atom leaves in far shells and in escape, (SHELLS + 1,), its cost in steps, its flights."""
    tally = tally_views(work.layout, np.zeros(work.layout.size))
    resume = new_resume(len(work.scene.lines))
    flights = trace_slice(work.world, launch, resume, tally, rng, PILOT_FLIGHTS)
    left = np.append(tally.content[1:, 0, 0], tally.ledger[Fate.ESCAPED])
    return left, flights + float(resume.counters[STEPS]), flights
