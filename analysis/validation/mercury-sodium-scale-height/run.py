"""The e-folding of sodium over Mercury's noon limb at 1,200 K, and the temperature an observer finds in it."""

import sys
from pathlib import Path

import tracer
from tracer.catalogue.load import bodies, gases
from tracer.engine.preview import preview
from tracer.engine.scene import build_scene

sys.path.append(str(Path(__file__).parents[1]))
from tangent_columns import Ball, Measured, measure, strip

FOLDER = Path(__file__).parent
PUBLISHED, KELVIN = 117e3, 1200.0
"""Scale height [m] and temperature [K], Cassidy et al. 2015, Icarus 248, 547."""
SEASONS = (0, 60, 120, 180, 240, 300)
"""True anomalies [deg]."""
DAY_SIDE = 'release[1].place={ law = "cosine-power", toward = "sun", power = 1 }'
CLOSE = 0.1
"""Relative deviation that counts as agreement."""


def main() -> int:
    """Print what is found, and return 0 where length and temperature are those published."""
    body = bodies()["Mercury"]
    ball = Ball(body.gm, body.radius, gases()["Na"].mass)
    print(f"kT/(m g) at the ground: {ball.scale_height(KELVIN) / 1e3:.1f} km")
    gravity = FOLDER / "gravity.toml"
    strips = {
        "column, gravity alone": strip(tracer.run(tracer.load_run(gravity)), "noon"),
        "column, gravity alone, day side": strip(tracer.run(tracer.load_run(gravity, [DAY_SIDE])), "noon"),
    }
    push = {}
    for anomaly in SEASONS:
        spec = tracer.load_run(FOLDER / "sunlight.toml", [f'sun.true_anomaly="{anomaly} deg"'])
        push[anomaly] = preview(spec, build_scene(spec), 1).sun.radiation_acceleration_over_gravity
        ds = tracer.run(spec)
        for quantity in ("column", "brightness"):
            strips[f"{quantity}, {anomaly} deg"] = strip(ds, "noon", quantity)
    found = measure(ball, KELVIN, PUBLISHED, strips)
    print("true anomaly  push/gravity  Chamberlain's temperature [K]  times 1 + push/gravity [K]")
    for anomaly in SEASONS:
        kelvin, more = found[f"column, {anomaly} deg"].kelvin, 1.0 + push[anomaly]
        weighed = Measured(kelvin.value * more, kelvin.error * more)
        print(f"{anomaly:8} deg  {push[anomaly]:12.3f}  {kelvin!s:>29}  {weighed!s:>26}")
    seen = [found[f"column, {anomaly} deg"] for anomaly in SEASONS]
    length = all(abs(1e3 * one.length.value / PUBLISHED - 1.0) < CLOSE for one in seen)
    kelvin = all(abs(one.kelvin.value / KELVIN - 1.0) < CLOSE for one in seen)
    print(
        f"e-folding length: {'holds' if length else 'FAILS'}; temperature: {'holds' if kelvin else 'FAILS'}"
    )
    return 0 if length and kelvin else 1


if __name__ == "__main__":
    sys.exit(main())
