"""Line width of sodium on Mercury's tail axis against distance, beside a published observation."""

import argparse
from itertools import pairwise
from pathlib import Path

import matplotlib
import numpy as np
from scipy.optimize import curve_fit

from tracer.catalogue.load import gases
from tracer.constants import BOLTZMANN
from tracer.engine.runspec.load import parse_run
from tracer.engine.tracing import run
from tracer.tally.velocity_moments import Moments, jackknife_errors, joined

FOLDER = Path(__file__).parent
LINE = "na_d2"
NEAR, FAR, FAR_FROM = 1200.0, 7500.0, 4.3
"""Lierle & Schmidt 2025: equivalent temperatures [K] near the body, and beyond so many radii."""

DAY = 'place = { law = "cosine-power", toward = "sun", power = 1 }'
EVEN = 'place = { law = "uniform" }'
SPUTTERED = 'speed = { law = "sigmund-thompson", binding_energy = "2 eV", cutoff_energy = "150 eV" }'
"""Solar-wind protons of 1 keV may hand over 4 m1 m2/(m1 + m2)^2 = 16 % of their energy to sodium."""
SOURCES = {
    "photon desorption, 1,200 K, day side": 'speed = { law = "maxwell-flux", temperature = "1200 K" }\n'
    + DAY,
    "the same from everywhere": 'speed = { law = "maxwell-flux", temperature = "1200 K" }\n' + EVEN,
    "impact vapour, 4,000 K, everywhere": 'speed = { law = "maxwell-flux", temperature = "4000 K" }\n' + EVEN,
    "the same from the day side": 'speed = { law = "maxwell-flux", temperature = "4000 K" }\n' + DAY,
    "sputtering, 2 eV, day side": SPUTTERED + "\n" + DAY,
}
VIEWS = {"across": 18.0, "oblique": 19.5, "steep": 21.0}
"""Local times [h] at which the viewer stands: at a right angle to the tail, 67.5 and 45 degrees from its axis."""
ANOMALIES = (56.0, 68.0, 80.0)
"""True anomalies [deg]: ends and middle of what was observed."""
EDGES = np.array([0, 0.5, 1, 1.5, 2, 2.5, 3, 3.5, 4, 5, 6, 7, 8, 10, 12, 14])
"""Ends of what is added up, in radii behind the body's centre on the sky."""

RUN = """
title = "widths"
[body]
name = "Mercury"
[sun]
true_anomaly = "{anomaly} deg"
[gas]
species = "Na"
[[release]]
name = "source"
rate = "1e24 s-1"
{source}
[surface]
sticking = 1.0
[domain]
outer_radius = "60 radii"
age_limit = "5 d"
[grid]
altitude = {{ first_cell = "1 radii", top = "10 radii", cells = 1 }}
latitude_cells = 1
local_time_cells = 1
{images}
[ensemble]
particles_per_batch = {particles}
batches = 20
replicates = 20
emphasis = "far"
seed = 20310601
"""
IMAGE = """
[[image]]
name = "{name}"
look_from = {{ latitude = "0 deg", local_time = {hour} }}
horizontal = ["-14 radii", "14 radii"]
vertical = ["-1 radii", "1 radii"]
pixels = [56, 1]
velocity = {{ from = "-15 km/s", to = "15 km/s", bins = 120 }}
"""


def temperature(width):
    """Return the temperature [K] of a gas whose velocities along the line scatter by `width` [m s-1]: m width^2/k."""
    return gases()["Na"].mass * np.square(width) / BOLTZMANN


def in_rows(ds, name):
    """Return which pixels of the strip make up each of `EDGES`; seen from the dusk side the Sun is at the left."""
    at = ds[f"{name}_horizontal"].values / ds.attrs["body_radius"]
    return [(at > low) & (at < high) for low, high in pairwise(EDGES)]


def widths(ds, name):
    """Return the width of the line and its standard error [m s-1] in each of `EDGES`.

    Pixels are put together before the width is taken, in the mean and in each replicate.
    """
    chosen = ds.sel(line=LINE).isel({"release": 0, f"{name}_vertical": 0})
    names = (f"brightness_{name}", f"line_shift_{name}", f"line_width_{name}")

    def moments(ending, group):
        parts = [chosen[one + ending].values.astype(np.float64) for one in names]
        parts = parts if group is None else [part[group] for part in parts]
        added = []
        for row in in_rows(ds, name):
            pixels = [Moments(*(part[pixel : pixel + 1] for part in parts)) for pixel in np.flatnonzero(row)]
            added.append(joined(pixels, [1] * len(pixels)))
        return Moments(*(np.concatenate(part) for part in zip(*added, strict=True)))

    groups = [moments("_replicates", group) for group in range(ds.sizes["replicate"])]
    return moments("", None).width, jackknife_errors(groups, [1] * len(groups))[1]


def gaussian(velocity, top, middle, width):
    return top * np.exp(-0.5 * ((velocity - middle) / width) ** 2)


def fitted(ds, name):
    """Return the width [m s-1] of a Gaussian fitted to the line profile in each of `EDGES`, as observers do."""
    chosen = ds.sel(line=LINE).isel({"release": 0, f"{name}_vertical": 0})
    profile, velocity = chosen[f"brightness_by_velocity_{name}"].values, ds[f"{name}_velocity"].values
    found = []
    for row in in_rows(ds, name):
        line = profile[:, row].sum(axis=1)
        middle = np.average(velocity, weights=line)
        first = (line.max(), middle, np.sqrt(np.average((velocity - middle) ** 2, weights=line)))
        try:
            best, _ = curve_fit(gaussian, velocity, line, first)
        except RuntimeError:
            # Seen steeply a profile may have two parts that no Gaussian describes.
            best = [np.nan] * 3
        found.append(abs(best[2]))
    return np.array(found)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--particles", type=int, default=2500, help="in each of 20 batches")
    arguments = parser.parse_args()
    images = "".join(IMAGE.format(name=name, hour=hour) for name, hour in VIEWS.items())
    table = {}
    for source, law in SOURCES.items():
        for anomaly in ANOMALIES:
            text = RUN.format(anomaly=anomaly, source=law, images=images, particles=arguments.particles)
            ds = run(parse_run(text, "widths"))
            print(
                f"{source}, true anomaly {anomaly:g} deg: equivalent temperature [K], and of a fitted Gaussian"
            )
            for view in VIEWS:
                width, error = widths(ds, view)
                kelvin = temperature(width)
                table[source, view, anomaly] = (
                    kelvin,
                    2.0 * kelvin * error / width,
                    temperature(fitted(ds, view)),
                )
            for i in range(len(EDGES) - 1):
                cells = (table[source, view, anomaly] for view in VIEWS)
                words = [f"{one[0][i]:6.0f} +- {one[1][i]:<4.0f} {one[2][i]:6.0f}" for one in cells]
                print(f"  {EDGES[i]:4.1f} to {EDGES[i + 1]:4.1f} radii   {'     '.join(words)}", flush=True)
    draw(table)


def draw(table) -> None:
    matplotlib.use("Agg")
    from matplotlib import pyplot

    figure, panels = pyplot.subplots(1, len(VIEWS), sharey=True, figsize=(9.6, 4.6), layout="constrained")
    at = 0.5 * (EDGES[:-1] + EDGES[1:])
    for panel, (view, hour) in zip(panels, VIEWS.items(), strict=True):
        for number, source in enumerate(SOURCES):
            colour = ("C0", "C9", "C1", "C3", "C2")[number]
            each = np.array([table[source, view, anomaly][0] for anomaly in ANOMALIES])
            panel.fill_between(at, each.min(axis=0), each.max(axis=0), color=colour, alpha=0.25, lw=0)
            kelvin, error, fit = table[source, view, ANOMALIES[1]]
            panel.errorbar(at, kelvin, error, fmt="o-", ms=3, color=colour, label=source)
            panel.plot(at, fit, ls=":", color=colour)
        panel.hlines(NEAR, 0.0, 1.0, color="black", lw=2.5)
        panel.hlines(
            FAR, FAR_FROM, EDGES[-1], color="black", lw=2.5, label="observed (Lierle & Schmidt 2025)"
        )
        panel.set(yscale="log", xlabel="radii behind Mercury on the sky")
        panel.set_title(f"viewer at {hour:g} h", fontsize=10)
        panel.grid(alpha=0.3)
    panels[0].set_ylabel("equivalent temperature, m sigma$^2$/k [K]")
    figure.legend(*panels[0].get_legend_handles_labels(), loc="outside lower center", ncols=3, fontsize=8)
    figure.suptitle(
        "Sodium D2 on the tail axis: true anomaly 68 deg (dotted: fitted Gaussian), band from 56 to 80 deg",
        fontsize=10,
    )
    figure.savefig(FOLDER / "widths.png", dpi=130)


if __name__ == "__main__":
    main()
