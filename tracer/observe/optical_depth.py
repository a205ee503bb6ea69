"""How thick the gas along a line of sight is at the centre of a line."""

import math

import numpy as np
from numpy.typing import NDArray

from tracer.constants import CLASSICAL_ELECTRON_RADIUS, SPEED_OF_LIGHT
from tracer.observe.run_facts import LineFacts

Floats = NDArray[np.float64]

THICK = 0.3
"""Optical depth above which single scattering, as the product has it, tells too much light."""


def cross_section(line: LineFacts, doppler_speed: float) -> float:
    """Return the absorption cross section [m2] of an atom at the centre of a line.

    sqrt(pi) r_e c f lambda / b with the classical electron radius r_e: pi e^2 f/(m_e c) lambda/(sqrt(pi) b) in Gaussian
    units (Spitzer 1978, Physical Processes in the Interstellar Medium, section 3.4; memory).

    Parameters
    ----------
    line : LineFacts
        Wavelength [m] and oscillator strength.
    doppler_speed : float
        b [m s-1], sqrt(2kT/m) of a gas at rest.
    """
    if not doppler_speed > 0.0:
        return math.nan
    strength = line.oscillator_strength * line.wavelength
    return math.sqrt(math.pi) * CLASSICAL_ELECTRON_RADIUS * SPEED_OF_LIGHT * strength / doppler_speed


def optical_depth(columns: Floats, line: LineFacts, doppler_speeds: Floats) -> Floats:
    """Return the optical depth (N, R) of the `columns` (N, R) [m-2] of R releases, each with its own Doppler speed.

    A release that is not there at all has depth 0, whatever its Doppler speed; NaN where the line's strength or the
    speed is not known. The depths of the releases add, as long as none moves as a whole.
    """
    sections = np.array([cross_section(line, speed) for speed in doppler_speeds])
    return np.asarray(np.where(columns > 0.0, columns * sections, 0.0))
