"""Units in which people read a product's fields, as factors on its SI values."""

PER_CUBIC_CENTIMETRE = 1e-6
"""Number density of 1 m-3 in cm-3."""
PER_SQUARE_CENTIMETRE = 1e-4
"""Column density of 1 m-2 in cm-2."""
KILOMETRES_PER_SECOND = 1e-3
"""Velocity of 1 m s-1 in km s-1."""
KILORAYLEIGH = 1e-3
"""Brightness of 1 R in kR; the product's unit, 1e10 m-2 s-1, is one rayleigh."""
