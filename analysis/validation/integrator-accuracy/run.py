"""Compare the integrator with DOP853 over many launches and print how far apart flights end."""

import argparse
import runpy
from pathlib import Path

import numpy as np

TEST = Path(__file__).parents[3] / "tests" / "physics" / "test_integrator_accuracy.py"


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--launches", type=int, default=1000)
    parser.add_argument("--tolerance", type=float, default=1e-11)
    arguments = parser.parse_args()
    compared = runpy.run_path(str(TEST))["compared"]
    print("temperature  quantity        median      99 %       greatest")
    for temperature in (1200.0, 3000.0):
        rows = compared(arguments.launches, temperature, 20, arguments.tolerance)
        for column, name in ((1, "place [radii]"), (2, "time [rel.]"), (3, "survival")):
            figures = "  ".join(f"{q:.2e}" for q in np.quantile(rows[:, column], [0.5, 0.99, 1.0]))
            print(f"{temperature:7.0f} K    {name:14}  {figures}")


if __name__ == "__main__":
    main()
