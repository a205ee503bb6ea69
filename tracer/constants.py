"""Physical constants in SI units, each with its source and uncertainty."""

BOLTZMANN = 1.380649e-23
"""Boltzmann constant k [J K-1]; exact (SI 2019)."""

AVOGADRO = 6.02214076e23
"""Avogadro constant [mol-1]; exact (SI 2019)."""

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

STEFAN_BOLTZMANN = 5.670374419e-8
"""Stefan-Boltzmann constant sigma [W m-2 K-4]; exact (SI 2019), rounded to ten digits."""

PROTON_MASS = 1.67262192595e-27
"""Mass of the proton [kg]; CODATA 2022 (memory), relative uncertainty 3.1e-10."""

VACUUM_PERMEABILITY = 1.25663706127e-6
"""Magnetic constant mu0 [T m A-1]; CODATA 2022 (memory), relative uncertainty 1.6e-10."""

SOLAR_IRRADIANCE = 1361.0
"""Total solar irradiance at 1 au [W m-2]; nominal, IAU 2015 resolution B3; it varies by about 0.1 %."""

JULIAN_YEAR = 365.25 * 86400.0
"""Julian year [s]; exact (IAU)."""

SOLAR_SYSTEM_AGE = 4.567e9 * JULIAN_YEAR
"""Age of the Solar System [s]: its oldest solids, 4567.3 +- 0.2 Myr (Connelly et al. 2012, Science 338; memory)."""

CLASSICAL_ELECTRON_RADIUS = 2.8179403205e-15
"""Classical electron radius e^2/(4 pi eps0 m_e c^2) [m]; CODATA 2022 (memory), relative uncertainty 4.7e-10."""

RAYLEIGH = 1e10
"""Photons m-2 s-1 in a rayleigh (Hunten, Roach & Chamberlain 1956, J. Atmos. Terr. Phys. 8, 345: memory)."""
