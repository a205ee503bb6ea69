"""Names that a user chooses from what there is."""

import difflib
from collections.abc import Iterable

from tracer.errors import InputError
from tracer.units import quoted

ALIKE = 0.6
LONGEST_FORMULA = 3


def unknown_name(option: str, name: str, known: Iterable[str], else_hint: str = "") -> InputError:
    """Return the error of a `name` not in the catalogue, with the one it was probably meant to be or all there are."""
    names = list(known)
    close = [entry for entry in names if entry.casefold() == name.casefold()]
    # A short name is a formula, and SO2 is not a slip for O2.
    if not close and len(name) > LONGEST_FORMULA:
        close = difflib.get_close_matches(name, names, n=1, cutoff=ALIKE)
    if close:
        return InputError(f"{option}: {quoted(name)} is not in the catalogue; did you mean {close[0]}?")
    return InputError(f"{option}: {quoted(name)} is not in the catalogue ({', '.join(names)}){else_hint}")
