"""How a particle's life ends."""

from enum import IntEnum


class Fate(IntEnum):
    """End of a particle's life; the values are positions along the product's `fate` dimension."""

    CAPTURED = 0
    """Adsorbed at the surface for good."""
    ESCAPED = 1
    """Crossed the outer radius outwards, bound or not."""
    IONIZED = 2
    """Ionised by sunlight."""
    OTHER_LOSS = 3
    """Removed in flight by any other loss."""
    AGE_LIMIT = 4
    """Still alive at the age limit."""
    UNRESOLVED = 5
    """The propagator gave up; must be zero."""

    @property
    def label(self) -> str:
        """Name in files and messages, for example `other_loss`."""
        return self.name.lower()


FATE_LABELS = tuple(fate.label for fate in Fate)
