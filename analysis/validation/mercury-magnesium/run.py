"""The e-folding of magnesium over Mercury's limb at 6,000 K, and the temperature an observer finds in it."""

import sys
from pathlib import Path

import tracer
from tracer.catalogue.load import bodies, gases

sys.path.append(str(Path(__file__).parents[1]))
from tangent_columns import Ball, measure, strip

FOLDER = Path(__file__).parent
PUBLISHED, KELVIN = 555e3, 6000.0
"""Scale height [m] and temperature [K], Merkel et al. 2017, Icarus 281, 46."""
SEASONS = (0, 180)
"""True anomalies [deg]: sunlight ionises most and least."""
CLOSE = 0.1
"""Relative deviation that counts as agreement."""


def main() -> int:
    """Print what is found, and return 0 where length and temperature are those published."""
    body = bodies()["Mercury"]
    ball = Ball(body.gm, body.radius, gases()["Mg"].mass)
    print(f"kT/(m g) at the ground: {ball.scale_height(KELVIN) / 1e3:.1f} km")
    strips = {"gravity alone": strip(tracer.run(tracer.load_run(FOLDER / "gravity.toml")), "noon")}
    for anomaly in SEASONS:
        ds = tracer.run(tracer.load_run(FOLDER / "sunlight.toml", [f'sun.true_anomaly="{anomaly} deg"']))
        for limb in ("noon", "dawn"):
            strips[f"{limb}, {anomaly} deg"] = strip(ds, limb)
    found = measure(ball, KELVIN, PUBLISHED, strips)
    seen = [one for name, one in found.items() if name != "gravity alone"]
    length = all(abs(1e3 * one.length.value / PUBLISHED - 1.0) < CLOSE for one in seen)
    kelvin = all(abs(one.kelvin.value / KELVIN - 1.0) < CLOSE for one in seen)
    print(
        f"e-folding length: {'holds' if length else 'FAILS'}; temperature: {'holds' if kelvin else 'FAILS'}"
    )
    return 0 if length and kelvin else 1


if __name__ == "__main__":
    sys.exit(main())
