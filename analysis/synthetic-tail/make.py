"""Make the synthetic measured tail of Harrow: trace the source, blur it as slit and seeing do, add noise.

The source stands in `source.toml` beside this file. What comes out, `runs/harrow-tail-observed.csv`, is all that
`tracer compare` gets of it. Seed of the noise and size of the errors stand below.
"""

import csv
import sys
from pathlib import Path

import numpy as np

import tracer
from tracer.observe.fit.comparison import optics_for
from tracer.observe.fit.images import image_of
from tracer.observe.fit.profile import Profile
from tracer.observe.fit.smearing import smearing

HERE = Path(__file__).parent
RUNS = HERE.parents[1] / "runs"
OBSERVATION, TABLE = RUNS / "harrow-tail-observation.toml", RUNS / "harrow-tail-observed.csv"

SEED = 20310803
POSITIONS = np.arange(-2.0, 17.01, 0.5)
RELATIVE, ABSOLUTE_KR, BACKGROUND_KR = 0.03, 0.4, 1.5
"""Standard errors: a part of the brightness and a constant, added in squares; and the background."""


def main(settings: list[str]) -> int:
    """Write the table; `settings` change the run file, as `--set` does."""
    spec = tracer.load_observation(OBSERVATION)
    product = tracer.run(tracer.load_run(HERE / "source.toml", settings))
    none = np.zeros(len(POSITIONS))
    optics = optics_for(spec, Profile(POSITIONS, none, none + 1.0, none > 0.0, "radii", "kR", 1e3), product)
    image = image_of(product, optics.view, None, optics.track)
    weights = smearing(image.edges, optics.track, optics.aperture, optics.spread)
    seen = product[f"brightness_{image.name}"].sel(line=spec.profile.line).sum("release").values
    true = weights @ seen.ravel() / 1e3 + BACKGROUND_KR
    sigma = np.hypot(RELATIVE * true, ABSOLUTE_KR)
    value = true + sigma * np.random.default_rng(SEED).normal(size=len(true))
    with TABLE.open("w", newline="", encoding="utf-8") as file:
        file.write(
            "# Invented: the sodium tail of the invented body Harrow, by analysis/synthetic-tail/make.py\n"
        )
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(["downtail_radii", "brightness_kR", "sigma_kR"])
        for row in zip(POSITIONS, value, sigma, strict=True):
            writer.writerow([f"{row[0]:.2f}", f"{row[1]:.3f}", f"{row[2]:.3f}"])
    print(TABLE)
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
