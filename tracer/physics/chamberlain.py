"""Density of a collisionless gas above a uniform thermal ground.

Chamberlain 1963, Planet. Space Sci. 11, 901 (memory): atoms leave as a flux-weighted Maxwellian by the cosine law; what
comes back is gone, and no orbit round the body is filled. lambda_c is the jeans parameter at the ground, l = lambda_c
R/r.
"""

from math import pi, sqrt

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import gamma, gammainc, gammaincc

from tracer.constants import BOLTZMANN

Floats = NDArray[np.float64]

HALF_ROOT_PI = float(gamma(1.5))


def base_density(flux: float, temperature: float, mass: float) -> float:
    """Return n_c = Phi sqrt(2 pi m/(kT)) [m-3] from the launched flux Phi [m-2 s-1], T [K] and m [kg]."""
    return flux * sqrt(2.0 * pi * mass / (BOLTZMANN * temperature))


def density_ratio(jeans: float, radii: ArrayLike) -> Floats:
    """Return n/n_c of ballistic and escaping atoms together.

    exp(l - lambda_c) (z_bal + z_esc) with psi = l^2/(l + lambda_c) and s = sqrt(1 - (l/lambda_c)^2):
    z_bal = (2/sqrt(pi)) [g(l) - s e^-psi g(l - psi)], g the lower incomplete gamma function of 3/2;
    z_esc = (1/sqrt(pi)) [G(l) - s e^-psi G(l - psi)], G the upper one.

    Parameters
    ----------
    jeans : float
        lambda_c, above 0.
    radii : array_like
        Distance from the centre in body radii, at least 1.

    Returns
    -------
    ndarray, shape of `radii`
        Falling outwards from a little below 1: fast atoms pass the ground only upwards. There is no outer radius.
    """
    inner = jeans / np.asarray(radii, dtype=np.float64)
    psi = inner * inner / (inner + jeans)
    lessened = np.sqrt(np.maximum(0.0, 1.0 - (inner / jeans) ** 2)) * np.exp(-psi)
    ballistic = 2.0 * (gammainc(1.5, inner) - lessened * gammainc(1.5, inner - psi))
    escaping = gammaincc(1.5, inner) - lessened * gammaincc(1.5, inner - psi)
    return np.asarray(np.exp(inner - jeans) * HALF_ROOT_PI / sqrt(pi) * (ballistic + escaping))
