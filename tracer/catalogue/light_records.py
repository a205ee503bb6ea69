"""Frozen records of lines and photo-rates, in SI units, velocities positive away from the Sun."""

from dataclasses import dataclass

from tracer.constants import SPEED_OF_LIGHT


@dataclass(frozen=True)
class ResidualFlux:
    """Solar flux over its quasi-continuum around a line: `offset` [m] from the laboratory wavelength, `flux`."""

    offset: tuple[float, ...]
    flux: tuple[float, ...]


@dataclass(frozen=True)
class GTable:
    """Photons scattered by one atom at 1 au: `velocity` [m s-1], `g` [s-1]."""

    velocity: tuple[float, ...]
    g: tuple[float, ...]


@dataclass(frozen=True)
class Line:
    """A resonance line.

    Vacuum `wavelength` [m], `wavelength_air` [m] (None in the far ultraviolet), absorption
    `oscillator_strength`, and what is known of its g: `continuum_g` [s-1] at 1 au with `residual_flux`, or a
    table `g`; each None where unknown.
    """

    name: str
    species: str
    wavelength: float
    wavelength_air: float | None
    oscillator_strength: float
    continuum_g: float | None
    residual_flux: ResidualFlux | None
    g: GTable | None

    @property
    def has_g(self) -> bool:
        """True where the catalogue can tell how the line shines and pushes."""
        return self.g is not None or self.residual_flux is not None

    def velocity_of_offset(self, offset: float) -> float:
        """Return the velocity [m s-1] at which an atom samples the residual flux at `offset` [m] from the line."""
        return -offset * SPEED_OF_LIGHT / (self.wavelength_air or self.wavelength)


@dataclass(frozen=True)
class PhotoRate:
    """All photo-losses of a species at 1 au under the quiet and the active Sun [s-1].

    `ionizing_quiet` and `ionizing_active` are the part that leaves an ion; None where the channels are not
    told apart. `low` and `high` bound the plausible range, `basis` says how the numbers are known.
    """

    species: str
    quiet: float
    active: float
    low: float
    high: float
    ionizing_quiet: float | None
    ionizing_active: float | None
    basis: str
