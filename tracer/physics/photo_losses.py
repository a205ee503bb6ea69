"""How fast sunlight destroys a gas at 1 au."""

from typing import NamedTuple

from tracer.catalogue.light_records import PhotoRate
from tracer.catalogue.photo_rates import photo_rates


class PhotoLoss(NamedTuple):
    """Rates at 1 au [s-1] of losses that leave an ion (`ionizing`) and of `other` ones.

    Where the catalogue doesn't tell a molecule's channels apart (`told_apart` False), all count as `other`.
    """

    ionizing: float
    other: float
    told_apart: bool

    @property
    def total(self) -> float:
        """The rate of all photo-losses at 1 au [s-1]."""
        return self.ionizing + self.other


def photo_loss(species: str, solar_activity: float) -> PhotoLoss | None:
    """Return the photo-losses of `species`, None where the catalogue has none.

    Rates go linearly from the quiet (`solar_activity` 0) to the active Sun (1), and as the inverse square of
    the distance from the Sun.

    Raises
    ------
    ValueError
        If `solar_activity` is not between 0 and 1.
    """
    if not 0.0 <= solar_activity <= 1.0:
        raise ValueError(f"solar activity goes from 0 (quiet) to 1 (active), not {solar_activity!r}")
    rate = photo_rates().get(species)
    return None if rate is None else _at_activity(rate, solar_activity)


def _at_activity(rate: PhotoRate, activity: float) -> PhotoLoss:
    total = _between(rate.quiet, rate.active, activity)
    if rate.ionizing_quiet is None or rate.ionizing_active is None:
        return PhotoLoss(0.0, total, False)
    ionizing = _between(rate.ionizing_quiet, rate.ionizing_active, activity)
    return PhotoLoss(ionizing, total - ionizing, True)


def _between(quiet: float, active: float, activity: float) -> float:
    return quiet + activity * (active - quiet)
