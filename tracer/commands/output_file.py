"""Where a command may write what: the ending of an output's name says its kind."""

from collections.abc import Sequence
from pathlib import Path

from tracer.errors import InputError
from tracer.product.writing import check_output
from tracer.units import quoted

FIGURE_ENDINGS = (".png", ".pdf", ".svg")
"""Endings of figures."""


def check_output_file(
    option: str, path: str, endings: Sequence[str], overwrite: bool, kind: str | None = None
) -> str:
    """Refuse an output that cannot be made, before any work is done for it, and return its ending.

    Raises
    ------
    InputError
        Another ending than the `endings`, of one `kind` of file where it is named, or as `check_output`.
    """
    ending = Path(path).suffix.lower()
    if ending not in endings:
        words = f"of a {kind}: " if kind else ""
        raise InputError(f"{option}: {quoted(path)} has none of the endings {words}{', '.join(endings)}")
    check_output(path, overwrite)
    return ending
