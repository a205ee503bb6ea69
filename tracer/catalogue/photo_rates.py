"""Rates at which sunlight ionises or breaks atoms and molecules."""

import re
from collections.abc import Mapping
from functools import cache
from types import MappingProxyType

from tracer.catalogue.light_records import PhotoRate
from tracer.catalogue.load import rows

_ELEMENT = re.compile(r"[A-Z][a-z]?")


@cache
def photo_rates() -> Mapping[str, PhotoRate]:
    """Return the photo-rates by species."""
    channels = {row["species"]: row for row in rows("photo_channels_1au.csv")}
    return MappingProxyType(
        {
            row["species"]: _photo_rate(row, channels.get(row["species"]))
            for row in rows("photo_rates_1au.csv")
        }
    )


def _photo_rate(row: dict[str, str], channels: dict[str, str] | None) -> PhotoRate:
    species = row["species"]
    ionizing = row if _ELEMENT.fullmatch(species) else channels
    basis = row["basis"]
    if ionizing is channels and channels is not None:
        basis += f"; ionising part {channels['basis']}"
    return PhotoRate(
        species=species,
        quiet=float(row["quiet_per_s"]),
        active=float(row["active_per_s"]),
        low=float(row["low_per_s"]),
        high=float(row["high_per_s"]),
        ionizing_quiet=float(ionizing["quiet_per_s"]) if ionizing else None,
        ionizing_active=float(ionizing["active_per_s"]) if ionizing else None,
        basis=basis,
    )
