"""Where a figure may be written."""

from pathlib import Path

from tracer.errors import InputError
from tracer.product.writing import check_output
from tracer.units import quoted

ENDINGS = (".png", ".pdf", ".svg")


def check_figure_file(option: str, path: str, overwrite: bool) -> str:
    """Refuse a figure's file that cannot be made, before any work is done for it, and return its ending.

    Raises
    ------
    InputError
        Another ending than those of figures, or as `check_output`.
    """
    ending = Path(path).suffix.lower()
    if ending not in ENDINGS:
        raise InputError(
            f"{option}: {quoted(path)} has none of the endings of a figure: {', '.join(ENDINGS)}"
        )
    check_output(path, overwrite)
    return ending
