"""Brightness and column of Mercury's sodium tail at 120 radii round the orbit, body standing still and moving."""

import argparse
from pathlib import Path

import matplotlib
import numpy as np

from tracer.engine.runspec.load import parse_run
from tracer.engine.tracing import run

FOLDER = Path(__file__).parent
OUTBOUND, INBOUND = 110.0, 250.0
TEMPERATURE = 3000
"""Of the release round the orbit [K]: at 1,200 K next to nothing reaches 120 radii at perihelion and aphelion."""
RUN = """
title = "tail"
[body]
name = "Mercury"
[sun]
true_anomaly = "{anomaly} deg"
motion = "{motion}"
[gas]
species = "Na"
[[release]]
name = "day side"
rate = "1e24 s-1"
speed = {{ law = "maxwell-flux", temperature = "{temperature} K" }}
place = {{ law = "cosine-power", toward = "sun", power = 1 }}
[surface]
sticking = 1.0
[domain]
outer_radius = "300 radii"
age_limit = "20 d"
[grid]
altitude = {{ first_cell = "1 radii", top = "10 radii", cells = 1 }}
latitude_cells = 1
local_time_cells = 1
[[image]]
name = "strip"
look_from = "north"
horizontal = ["-130 radii", "-110 radii"]
vertical = ["-15 radii", "15 radii"]
pixels = [1, 1]
[ensemble]
particles_per_batch = {particles}
batches = 20
replicates = 0
seed = 20310601
"""


def tail(anomaly, motion, temperature, particles):
    """Return (brightness [R], its error, column [m-2], its error) of the strip at 120 radii."""
    text = RUN.format(anomaly=anomaly, motion=motion, temperature=temperature, particles=particles)
    ds = run(parse_run(text, "tail"))
    light, errors = ds.brightness_strip.values.ravel(), ds.brightness_strip_standard_error.values.ravel()
    column, error = float(ds.column_strip.squeeze()), float(ds.column_strip_standard_error.squeeze())
    # Both lines shine from the same atoms: their errors go together.
    return float(light.sum()), float(np.nan_to_num(errors).sum()), column, error


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--particles", type=int, default=6000, help="in each of 20 batches")
    parser.add_argument("--step", type=float, default=20.0, help="of true anomaly round the orbit [deg]")
    arguments = parser.parse_args()
    for temperature in (1200, 3000):
        for motion in ("stationary", "moving"):
            out, back = (tail(a, motion, temperature, 4 * arguments.particles) for a in (OUTBOUND, INBOUND))
            print(f"{temperature} K, {motion}: outbound over inbound")
            for name, i in (("brightness", 0), ("column", 2)):
                ratio = out[i] / back[i]
                error = ratio * np.hypot(out[i + 1] / out[i], back[i + 1] / back[i])
                print(
                    f"  {name:10} {ratio:6.2f} +- {error:.2f}   ({out[i]:.3e} over {back[i]:.3e})", flush=True
                )
    anomalies = np.unique(np.append(np.arange(0.0, 360.0, arguments.step), [OUTBOUND, INBOUND]))
    table = {
        motion: np.array([tail(a, motion, TEMPERATURE, arguments.particles) for a in anomalies])
        for motion in ("stationary", "moving")
    }
    print("true anomaly   brightness [R]: stationary, moving     column [1e10 m-2]: stationary, moving")
    for i, anomaly in enumerate(anomalies):
        one, two = table["stationary"][i], table["moving"][i]
        print(
            f"{anomaly:8.0f} deg   {one[0]:9.3g} +- {one[1]:<8.2g} {two[0]:9.3g} +- {two[1]:<8.2g}"
            f"  {one[2] / 1e10:9.3g} {two[2] / 1e10:9.3g}"
        )
    draw(anomalies, table)


def draw(anomalies, table) -> None:
    matplotlib.use("Agg")
    from matplotlib import pyplot

    figure, axes = pyplot.subplots(2, 1, sharex=True, figsize=(6.4, 6.0), layout="constrained")
    for axis, column, label in ((axes[0], 0, "brightness [R]"), (axes[1], 2, "column [m$^{-2}$]")):
        for motion, mark in (("stationary", "o--"), ("moving", "s-")):
            seen = table[motion][:, column] > 0.0
            value, error = table[motion][seen, column], table[motion][seen, column + 1]
            down = np.minimum(error, 0.7 * value)
            axis.errorbar(anomalies[seen], value, (down, error), fmt=mark, ms=4, label=motion)
        axis.set(yscale="log", ylabel=label)
        axis.grid(alpha=0.3)
    axes[0].legend()
    axes[0].set_title(
        "Sodium 110 to 130 radii behind Mercury, 30 radii wide, 3,000 K, $10^{24}$ s$^{-1}$", fontsize=10
    )
    axes[1].set(xlabel="true anomaly [deg], outbound up to 180", xlim=(-5, 365))
    figure.savefig(FOLDER / "seasons.png", dpi=130)


if __name__ == "__main__":
    main()
