"""Frozen records of what the catalogue holds, in SI units."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Orbit:
    """A Keplerian ellipse about `host`: `semi_major_axis` [m], `eccentricity` in [0, 1)."""

    semi_major_axis: float
    eccentricity: float


@dataclass(frozen=True)
class Host:
    """The Sun or a planet with moons: `gm` [m3 s-2], `radius` [m], heliocentric `orbit` (None for the Sun)."""

    name: str
    gm: float
    radius: float
    orbit: Orbit | None


@dataclass(frozen=True)
class Body:
    """An airless body.

    `gm` [m3 s-2], `radius` [m], sidereal `rotation_period` [s], `orbit` about `host`, `bond_albedo`,
    `emissivity`, and `equatorial_field` [T], the magnetic field at the equator's surface, 0 where unmagnetised.
    """

    name: str
    host: Host
    gm: float
    radius: float
    rotation_period: float
    orbit: Orbit
    bond_albedo: float
    emissivity: float
    equatorial_field: float

    @property
    def heliocentric_orbit(self) -> Orbit:
        """The orbit about the Sun: the host's where the host is a planet."""
        return self.host.orbit or self.orbit


@dataclass(frozen=True)
class Gas:
    """A species: `mass` [kg] of one atom or molecule and a word of `description`."""

    name: str
    mass: float
    description: str
