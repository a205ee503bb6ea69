"""The e-folding of calcium over Mercury's dawn limb at 50,000 K, and the temperature an observer finds in it."""

import sys
from pathlib import Path

import tracer
from tracer.catalogue.load import bodies, gases

sys.path.append(str(Path(__file__).parents[1]))
from tangent_columns import Ball, measure, strip

FOLDER = Path(__file__).parent
SHORTEST, LONGEST, KELVIN = 2500e3, 2800e3, 50000.0
"""E-folding lengths [m] and temperature [K], Robidel et al. 2023, JGR Planets."""
MIDDLE = 0.5 * (SHORTEST + LONGEST)
FLYBYS = ("2021-10-01T23:34:00", "2022-06-23T09:44:00")
"""The first two of BepiColombo at Mercury (memory)."""
SLOWER = 'gas.photoionization_rate="3.0e-5 s-1"'
"""The lowest published rate (Heays et al. 2017, A&A 602, A105), where the catalogue has 7.0e-5 s-1."""
CLOSE = 0.1
"""Relative deviation from the published range that counts as agreement."""


def main() -> int:
    """Print what is found, and return 0 where length and temperature are those published."""
    body = bodies()["Mercury"]
    ball = Ball(body.gm, body.radius, gases()["Ca"].mass)
    print(f"kT/(m g) at the ground: {ball.scale_height(KELVIN) / 1e3:.1f} km")
    strips = {"column, gravity alone": strip(tracer.run(tracer.load_run(FOLDER / "gravity.toml")), "noon")}
    cases = {epoch: [f'sun.epoch="{epoch}"'] for epoch in FLYBYS}
    cases["slower ionisation"] = [SLOWER]
    for name, changes in cases.items():
        ds = tracer.run(tracer.load_run(FOLDER / "sunlight.toml", changes))
        print(f"{name}: true anomaly {ds.attrs['true_anomaly']:.1f} deg")
        for quantity in ("column", "brightness"):
            strips[f"{quantity}, {name}"] = strip(ds, "dawn", quantity)
    found = measure(ball, KELVIN, MIDDLE, strips)
    seen = [1e3 * found[f"brightness, {epoch}"].length.value for epoch in FLYBYS]
    fine = all((1.0 - CLOSE) * SHORTEST < one < (1.0 + CLOSE) * LONGEST for one in seen)
    print(f"e-folding length of the brightness: {'holds' if fine else 'FAILS'}")
    return 0 if fine else 1


if __name__ == "__main__":
    sys.exit(main())
