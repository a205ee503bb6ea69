"""Heat conduction into the ground under the turning Sun: the periodic steady state of its temperature.

Each latitude is a column of ground of its own, lit as the body turns on an axis upright on its orbit. With u the
temperature in units of the subsolar equilibrium temperature, phi the angle that the body has turned and zeta the depth
in skin depths, sqrt(2 kappa / rate),

    du/dphi = (1/2) d2u/dzeta2,    u^4 - (Theta/sqrt 2) du/dzeta = max(0, cos of the solar zenith angle)  at zeta = 0:

one number decides, the thermal parameter Theta (Spencer, Lebofsky & Sykes 1989, Icarus 78, 337: memory). Depth is cut
into finite volumes, time into implicit steps of the second-order backward difference formula. Conduction is linear, so
that the steady state needs no spinning up: a column answers to each harmonic of the day by itself, and only the surface
temperatures of one day are left to solve for, by Newton's method.
"""

from functools import lru_cache
from math import sqrt
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import lu_factor, lu_solve

from tracer.constants import STEFAN_BOLTZMANN
from tracer.errors import TracerError
from tracer.kernels.surface_map import HOURS_A_TURN, SurfaceMap
from tracer.physics.equilibrium import equilibrium_temperature

Floats = NDArray[np.float64]
Complex = NDArray[np.complex128]

LATITUDES = 180
"""Cells of the map, of 1 deg; the two hemispheres are alike."""

STEPS = 240
"""Time steps a turn, whose ends are the map's local times, 0.1 h apart.

A multiple of 4, so that sunrise and sunset end a step: within one, the bend of the light would cost a digit there.
"""

FIRST_LAYER, GROWTH, DEEPEST = 0.005, 1.04, 10.0
"""Spacing of the depths [skin depths] at the surface, its growth, and the depth where no heat flows."""

SMALLEST_THETA, LARGEST_THETA = 1e-12, 1e6
"""Beyond these the ground is at its two limits, without heat of its own or without day and night."""

CONVERGED = 1e-11
STALLED = 1e-7
"""Change of u below which it may be rounding that keeps it from falling: where Theta is large the sum of fluxes is."""

MOST_ITERATIONS = 400
REFRESHED = 5
"""Iterations after which the slope is worked out anew; between, one factorisation serves."""

DIGITS = 6
"""Decimals kept of u: far below the error of the steps, far above that of the linear algebra of different machines."""

COLDEST = 10.0**-DIGITS


class Ground(NamedTuple):
    """What the ground is like: `thermal_inertia` sqrt(k rho c) [J m-2 K-1 s-1/2], Bond `albedo`, `emissivity`."""

    thermal_inertia: float
    albedo: float
    emissivity: float


def thermal_parameter(ground: Ground, subsolar: float, rate: float) -> float:
    """Return Theta = Gamma sqrt(rate) / (eps sigma T^3), T the `subsolar` equilibrium temperature [K].

    `rate` [rad s-1] is that at which the body turns under the Sun.
    """
    radiated = ground.emissivity * STEFAN_BOLTZMANN * subsolar**3
    return ground.thermal_inertia * sqrt(abs(rate)) / radiated


def conduction_map(ground: Ground, distance: float, rate: float) -> SurfaceMap:
    """Return the temperatures [K] of the surface in the periodic steady state.

    Parameters
    ----------
    ground : Ground
        Thermal inertia above 0, albedo below 1.
    distance : float
        Distance from the Sun [m].
    rate : float
        Mean rate [rad s-1] at which the body turns under the Sun, not 0; where it is negative the Sun moves from dusk
        to dawn.
    """
    subsolar = equilibrium_temperature(ground.albedo, ground.emissivity, distance)
    theta = thermal_parameter(ground, subsolar, rate)
    northern = reduced_temperatures(min(max(theta, SMALLEST_THETA), LARGEST_THETA))
    if rate < 0.0:
        # Midnight stays where it is.
        northern = np.roll(northern[:, ::-1], 1, axis=1)
    step = 180.0 / LATITUDES
    latitudes = step * (np.arange(LATITUDES) + 0.5) - 90.0
    return SurfaceMap(latitudes, local_times(), subsolar * np.concatenate((northern[::-1], northern)))


def local_times() -> Floats:
    """Return the ends of the time steps as local times [h], (STEPS,), from midnight on."""
    return HOURS_A_TURN * np.arange(STEPS) / STEPS


@lru_cache(maxsize=8)
def reduced_temperatures(theta: float) -> Floats:
    """Return u at the surface, (LATITUDES/2, STEPS), from the equator to the north pole and from midnight on.

    `theta` is the thermal parameter, above 0.
    """
    weights = response_weights(theta)
    lag = np.arange(STEPS)[:, np.newaxis] - np.arange(STEPS)
    response = weights[lag % STEPS]
    rows: list[Floats] = [np.ones(STEPS)]
    for cosine in np.cos(np.radians((np.arange(LATITUDES // 2) + 0.5) * 180.0 / LATITUDES)):
        guess = 2.0 * rows[-1] - rows[-2] if len(rows) > 2 else rows[-1]
        rows.append(_steady_state(response, cosine * overhead_light(), guess))
    return np.maximum(np.round(np.array(rows[1:]), DIGITS), COLDEST)


def overhead_light() -> Floats:
    """Return max(0, cos of the solar zenith angle) on the equator at the ends of the time steps, (STEPS,).

    Scaled by the few parts in 1e5 that make the steps' mean the day's, 1/pi.
    """
    light = np.maximum(0.0, np.cos((local_times() - 12.0) * np.pi / 12.0))
    # Rounding must not light the horizon.
    light[light < 1e-12] = 0.0
    return np.asarray(light / (np.pi * light.mean()))


def response_weights(theta: float) -> Floats:
    """Return w, (STEPS,): the heat flux into the ground is sum over j of w[j] u[n - j], in units of eps sigma T^4."""
    h = 2.0 * np.pi / STEPS
    backward = np.exp(-1j * h * np.arange(STEPS // 2 + 1))
    rate = (1.5 - 2.0 * backward + 0.5 * backward * backward) / h
    # What is constant in time heats nothing.
    rate[0] = 0.0
    return theta * np.fft.irfft(columns_answer(rate).admittance, STEPS)


class ColumnAnswer(NamedTuple):
    """How a column answers to surface temperatures ~ exp(rate phi), for n rates.

    `admittance` (n,) is the heat flux into the ground per surface temperature, sqrt(rate) for an endless column; `wave`
    (n, depths) the temperature at each depth per surface temperature.
    """

    admittance: Complex
    wave: Complex


def depths() -> Floats:
    """Return the depths [skin depths] of the middles of the finite volumes; the first is the surface itself."""
    layers = int(np.ceil(np.log1p(DEEPEST * (GROWTH - 1.0) / FIRST_LAYER) / np.log(GROWTH)))
    return np.concatenate(([0.0], np.cumsum(FIRST_LAYER * GROWTH ** np.arange(layers))))


def columns_answer(rate: Complex) -> ColumnAnswer:
    """Return the answer of the column of finite volumes to surface temperatures ~ exp(`rate` phi), (n,).

    Volumes hold heat and the ground between them resists: a ladder, worked up from the deepest rung.
    """
    spacing = np.diff(depths())
    held = np.sqrt(2.0) * 0.5 * (np.append(spacing, 0.0) + np.append(0.0, spacing))
    resistance = np.sqrt(2.0) * spacing
    admittance = rate * held[-1]
    shares = []
    for k in range(len(resistance) - 1, -1, -1):
        share = 1.0 / (1.0 + resistance[k] * admittance)
        shares.append(share)
        admittance = rate * held[k] + share * admittance
    steps = np.stack([np.ones_like(admittance), *reversed(shares)], axis=-1)
    return ColumnAnswer(admittance, np.cumprod(steps, axis=-1))


def _steady_state(response: Floats, light: Floats, start: Floats) -> Floats:
    """Return u, (STEPS,), with u^4 + response @ u = light, by Newton's method from `start`.

    The left side is convex, and a smaller u at one time asks for no more light at any other: whatever the start, the
    steps after the first come down to the solution from above.
    """
    u = np.maximum(start, COLDEST)
    diagonal = np.arange(len(u))
    before = np.inf
    for iteration in range(MOST_ITERATIONS):
        if iteration % REFRESHED == 0:
            slope = response.copy()
            slope[diagonal, diagonal] += 4.0 * u**3
            factors = lu_factor(slope, overwrite_a=True, check_finite=False)
        change = lu_solve(factors, u**4 + response @ u - light, check_finite=False)
        u = np.maximum(u - change, COLDEST)
        largest = np.max(np.abs(change))
        if largest < CONVERGED or 0.5 * before < largest < STALLED:
            return u
        before = largest
    raise TracerError("the temperatures of the ground do not settle. This is a fault of the program")
