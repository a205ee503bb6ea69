"""Sunlight draws sodium out into a tail away from the Sun, at Mercury near the greatest push."""

import numpy as np
import pytest

from tracer.engine.batches import Task, make_work, trace_batch
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene
from tracer.tally.buffer import tally_views

RUN = """
title = "tail"
[body]
name = "Mercury"
[sun]
true_anomaly = "60 deg"
[gas]
species = "Na"
[[release]]
name = "impact vapour"
rate = "1e24 s-1"
speed = { law = "maxwell-flux", temperature = "4000 K" }
[surface]
sticking = 1.0
[domain]
outer_radius = "25 radii"
[grid]
altitude = { cells = 1 }
latitude_cells = 1
local_time_cells = 1
[[image]]
name = "north"
look_from = "north"
horizontal = ["-20 radii", "20 radii"]
vertical = ["-20 radii", "20 radii"]
pixels = [4, 1]
[ensemble]
particles_per_batch = 2_500
batches = 10
"""
BATCHES = 10


@pytest.fixture(scope="module")
def scene():
    return build_scene(parse_run(RUN, "run file"))


def strips(scene):
    """Return (batch, strip): what images hold at -20 to -10, -10 to 0, 0 to 10 and 10 to 20 radii, Sun at the right."""
    work = make_work(scene, 7, 2_500)
    results = [trace_batch(work, Task(0, b), lambda _a, _f: None, lambda: False) for b in range(BATCHES)]
    return np.array([tally_views(work.layout, one.buffer).image_content for one in results])


def asymmetry(scene):
    """Return mean and standard error over batches of (tail - sunward)/(tail + sunward), -1 to 1."""
    away, _, _, sunward = strips(scene).T
    each = (away - sunward) / (away + sunward)
    return each.mean(), each.std(ddof=1) / np.sqrt(BATCHES)


def pushed(scene, factor):
    """The same scene with every line's g, and so the push, times `factor`."""
    lines = tuple(line._replace(g=factor * line.g) for line in scene.sun.lines)
    return scene._replace(sun=scene.sun._replace(lines=lines))


def test_sodium_far_from_the_body_is_behind_it(scene):
    mean, error = asymmetry(scene)
    # Ten times as much at 10 to 20 radii behind the body as before it, at the least.
    assert mean - 4.0 * error > 9.0 / 11.0


def test_reversed_push_makes_the_tail_go_sunward(scene):
    mean, error = asymmetry(pushed(scene, -1.0))
    assert mean + 4.0 * error < -9.0 / 11.0


def test_without_push_there_is_no_tail(scene):
    mean, error = asymmetry(pushed(scene, 0.0))
    # The tide alone is the same on both sides to a thousandth; loss in sunlight takes a little from the sunward side.
    assert abs(mean) < 0.05 + 4.0 * error
    assert error < 0.1
