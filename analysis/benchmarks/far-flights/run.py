"""What a sodium flight from Mercury to 1,000 radii costs beside one that lands, in steps and in time."""

import argparse
import time

import numpy as np

from tracer.engine.kernel_world import kernel_world
from tracer.engine.launching import draw_launches, ground_velocities
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene
from tracer.kernels.endings import CROSSED, LANDED
from tracer.kernels.integrated_flight import TIME, TRIALS, fly, new_curve, new_flight, start_flight

RUN = """
title = "far flights"
[body]
name = "Mercury"
[sun]
true_anomaly = "{anomaly} deg"
motion = "{motion}"
[gas]
species = "Na"
[[release]]
name = "vapour"
rate = "1e24 s-1"
speed = {{ law = "maxwell-flux", temperature = "3000 K" }}
[surface]
sticking = 1.0
[domain]
outer_radius = "1000 radii"
age_limit = "30 d"
"""


def flights(motion, anomaly, launches):
    """Return (n, 4): ending, trial steps, time of flight [s], processor time [s]."""
    scene = build_scene(parse_run(RUN.format(motion=motion, anomaly=anomaly), "run"))
    light = kernel_world(scene).light
    drawn = draw_launches(scene, scene.releases[0], launches, np.random.default_rng(1), 1.0)
    places = drawn.positions * scene.body.radius
    velocities = drawn.velocities + ground_velocities(scene, drawn.positions)
    flight, curve, age = new_flight(), new_curve(), scene.age_limit
    rows = []
    for place, velocity in zip(places.tolist(), velocities.tolist(), strict=True):
        begin = time.perf_counter()
        start_flight(flight, light.conditions, light.tolerance, *place, *velocity)
        ending = fly(flight, curve, light.conditions, light.tolerance, age)
        rows.append((ending, flight[TRIALS], flight[TIME], time.perf_counter() - begin))
    return np.array(rows[1:])


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--launches", type=int, default=6000)
    arguments = parser.parse_args()
    print("motion      anomaly   steps: landing  1,000 radii  ratio   median us: landing  1,000 radii  ratio")
    for motion in ("stationary", "moving"):
        for anomaly in (60, 110, 250):
            rows = flights(motion, anomaly, arguments.launches)
            near, far = rows[rows[:, 0] == LANDED], rows[rows[:, 0] == CROSSED]
            steps = near[:, 1].mean(), far[:, 1].mean()
            spent = np.median(near[:, 3]) * 1e6, np.median(far[:, 3]) * 1e6
            print(
                f"{motion:10} {anomaly:5} deg {steps[0]:12.1f} {steps[1]:12.1f} {steps[1] / steps[0]:8.1f}"
                f" {spent[0]:16.1f} {spent[1]:12.1f} {spent[1] / spent[0]:8.1f}"
            )


if __name__ == "__main__":
    main()
