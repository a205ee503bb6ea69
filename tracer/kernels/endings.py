"""How one flight ends; FLYING where it has not."""

FLYING = -1
LANDED = 0
CROSSED = 1
AGED = 2
UNRESOLVED = 3
DROPPED = 4
"""Its weight had become negligible, and roulette ended it."""
STRUCK = 5
"""It hit the host."""
