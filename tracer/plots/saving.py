"""A figure as the bytes of a file."""

import io
import warnings
from typing import Any

from matplotlib.figure import Figure

from tracer.plots.style import styled

DOTS_PER_INCH = 300
"""Resolution of pixels; common practice for print."""
ENDINGS: dict[str, dict[str, Any]] = {
    # Without the date and version, equal products give equal files.
    ".png": {"Software": None},
    ".pdf": {"CreationDate": None, "Creator": None, "Producer": None},
    ".svg": {"Date": None, "Creator": None},
}
"""Endings of files that a figure can be written to, with what is said in the file about its making."""


def figure_bytes(figure: Figure, suffix: str, dots_per_inch: int = DOTS_PER_INCH) -> bytes:
    """Return the figure as the content of a file with the ending `suffix`, a key of `ENDINGS`.

    Drawings with lines (PDF, SVG) keep letters and lines as such; their cells are pixels of `dots_per_inch`.
    """
    # The smaller of the ways to write the same pixels; drawings with lines know no such choice.
    packing: dict[str, Any] = {"pil_kwargs": {"optimize": True}} if suffix == ".png" else {}
    content = io.BytesIO()
    with styled(), warnings.catch_warnings():
        # A title may have letters that the font lacks; they are drawn as boxes.
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        figure.savefig(content, format=suffix[1:], dpi=dots_per_inch, metadata=ENDINGS[suffix], **packing)
    return content.getvalue()
