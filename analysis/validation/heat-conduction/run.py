"""The steady state of conducting ground against SciPy's stiff solver marched in time, and against lunar nights."""

import sys

import numpy as np
from scipy.integrate import solve_ivp

from tracer.constants import ASTRONOMICAL_UNIT
from tracer.kernels.surface_map import interpolated
from tracer.physics.conduction import (
    LATITUDES,
    Ground,
    columns_answer,
    conduction_map,
    depths,
    local_times,
    thermal_parameter,
)
from tracer.physics.equilibrium import equilibrium_temperature
from tracer.tally.axes import direction

CASES = {
    # Thermal inertia, albedo, distance [au], solar day [d]: invented ground but for the Moon's day and distance.
    "lunar soil": (55.0, 0.11, 1.0, 29.530589),
    "lunar rock": (2200.0, 0.11, 1.0, 29.530589),
    "dust close to the Sun": (30.0, 0.08, 0.39, 176.0),
    "small fast body": (15.0, 0.03, 2.767, 0.378),
}
ROWS = (0, 45, 80)
"""Latitudes, counted from the equator in cells of 1 deg."""

TURNS, LAYERS, FIRST, GROWTH = 6, 140, 0.002, 1.035
ALLOWED, ALLOWED_AT_HORIZON = 0.005, 0.04
"""Of the temperature: all day, and while the Sun is within `HORIZON_HOURS` of rising or setting."""

HORIZON_HOURS = 0.5


def marched(theta: float, cosine: float, mean: float) -> np.ndarray:
    """Return u at the map's local times in the last of `TURNS` turns, by the method of lines on a grid of its own.

    Conduction that does not depend on temperature leaves the mean of a steady state the same at every depth: `mean` is
    a start from which little is left after a few turns, whatever it is.
    """
    gaps = FIRST * GROWTH ** np.arange(LAYERS - 1)
    width = 0.5 * (np.append(gaps, 0.0) + np.append(0.0, gaps))

    def rate(phi: float, u: np.ndarray) -> np.ndarray:
        light = cosine * max(0.0, np.cos(phi))
        inflow = (light - u[0] ** 4) * np.sqrt(2.0) / theta
        return 0.5 * np.diff(np.concatenate(([-inflow], np.diff(u) / gaps, [0.0]))) / width

    phi = (local_times() - 12.0) * np.pi / 12.0
    end = 2.0 * np.pi * (TURNS - 1)
    options = {"method": "LSODA", "lband": 1, "uband": 1, "rtol": 1e-7, "atol": 1e-9, "max_step": 0.02}
    path = solve_ivp(rate, (-np.pi, end + np.pi), np.full(LAYERS, mean), t_eval=end + phi, **options)
    return path.y[0]


def main() -> int:
    """Print all comparisons and return 0 where the claims hold."""
    holds = True
    print(
        "ground | Theta | latitude [deg] | error [K] | at the horizon [K] | relative | at the horizon | balance"
    )
    for name, (inertia, albedo, distance, day) in CASES.items():
        ground, rate = Ground(inertia, albedo, 0.95), 2.0 * np.pi / (day * 86400.0)
        subsolar = equilibrium_temperature(albedo, 0.95, distance * ASTRONOMICAL_UNIT)
        theta = thermal_parameter(ground, subsolar, rate)
        table = conduction_map(ground, distance * ASTRONOMICAL_UNIT, rate)
        for row in ROWS:
            found = table.values[LATITUDES // 2 + row] / subsolar
            cosine = np.cos(np.radians(row + 0.5))
            error = np.abs(found - marched(theta, cosine, found.mean()))
            horizon = np.abs(np.abs(local_times() - 12.0) - 6.0) < HORIZON_HOURS
            worst, worst_at_horizon = np.max((error / found)[~horizon]), np.max((error / found)[horizon])
            balance = np.mean(found**4) / (cosine / np.pi) - 1.0
            holds &= worst < ALLOWED and worst_at_horizon < ALLOWED_AT_HORIZON and abs(balance) < 1e-6
            print(
                f"{name} | {theta:.2g} | {row + 0.5} | {subsolar * error[~horizon].max():.2f} | "
                f"{subsolar * error[horizon].max():.2f} | {worst:.1e} | {worst_at_horizon:.1e} | {balance:.0e}"
            )
    wave, z = columns_answer(np.array([1j])).wave[0], depths()
    for depth in (1.0, 2.0, 3.0):
        above = z < depth
        damping = np.max(np.abs(np.abs(wave[above]) * np.exp(z[above]) - 1.0))
        lag = np.degrees(np.max(np.abs(-np.unwrap(np.angle(wave[above])) - z[above])))
        holds &= damping < 0.0025 and lag < 0.1
        print(f"wave down to {depth:g} skin depths: amplitude within {damping:.1e}, lag within {lag:.3f} deg")
    moon = conduction_map(Ground(55.0, 0.11, 0.95), ASTRONOMICAL_UNIT, 2.0 * np.pi / (29.530589 * 86400.0))
    for hour, observed in ((12.0, 392.0), (0.0, 101.83), (5.5, 95.03)):
        kelvin = interpolated(moon, *direction(0.0, hour))
        holds &= abs(kelvin / observed - 1.0) < 0.05
        print(f"lunar soil at {hour:g} h on the equator: {kelvin:.1f} K, observed about {observed:g} K")
    print("the claims hold" if holds else "the claims do not hold")
    return 0 if holds else 1


if __name__ == "__main__":
    sys.exit(main())
