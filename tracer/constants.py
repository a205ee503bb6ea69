"""Physical constants in SI units, each with its source and uncertainty."""

BOLTZMANN = 1.380649e-23
"""Boltzmann constant k [J K-1]; exact (SI 2019)."""

ATOMIC_MASS = 1.66053906892e-27
"""Atomic mass constant u [kg]; CODATA 2022, relative uncertainty 3.1e-10."""

GM_SUN = 1.32712440018e20
"""Heliocentric gravitational constant [m3 s-2]; JPL Solar System Dynamics (memory), relative uncertainty 1e-10."""

ASTRONOMICAL_UNIT = 1.495978707e11
"""Astronomical unit [m]; exact (IAU 2012 resolution B2)."""

SPEED_OF_LIGHT = 299792458.0
"""Speed of light in vacuum c [m s-1]; exact (SI 2019)."""

PLANCK = 6.62607015e-34
"""Planck constant h [J s]; exact (SI 2019)."""
