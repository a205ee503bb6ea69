"""Titles and captions: the user's own words kept plain, broken into lines that fit."""

import textwrap

from matplotlib.figure import Figure

from tracer.plots.style import (
    MILLIMETRES_PER_INCH,
    MILLIMETRES_PER_POINT,
    SMALL_SIZE,
    TEXT_SIZE,
    TITLE_SIZE,
    WIDTHS,
    Box,
    Width,
    blank_figure,
    line_height,
)

MARGIN = 2.0
"""Free space [mm] along the figure's rim."""
LETTER_WIDTH = 0.55
"""Mean width of a letter of the font over its size, on the safe side."""
WORDY, NUMBERED, MANY = 0.57, 0.64, 0.2
"""That of captions, whose lines are long and may happen to be wide, and of those of which more than such a share are
digits and signs."""
BOLD = 1.08
"""Width of bold letters over that of others."""
TITLE_LINES, SUBTITLE_LINES, CAPTION_LINES = 2, 2, 8


def plain(text: str) -> str:
    """Return the user's text such that its dollar signs start no formula."""
    return text.replace("$", r"\$")


def broken(text: str, width: float, size: float, lines: int) -> list[str]:
    """Return the text in at most `lines` lines that fit into `width` [mm] at letters of `size` [pt].

    What does not fit is cut, and an ellipsis says so.
    """
    letters = max(4, int(width / (LETTER_WIDTH * size * MILLIMETRES_PER_POINT)))
    return textwrap.wrap(text, letters, max_lines=lines, placeholder=" \N{HORIZONTAL ELLIPSIS}")


def framed_figure(width: Width, height: float, title: str, subtitle: str, caption: str) -> tuple[Figure, Box]:
    """Return a figure with title, subtitle and caption, and the box of `height` [mm] left between them."""
    across = WIDTHS[width]
    inner = across - 2.0 * MARGIN
    head = [
        *((line, TITLE_SIZE, "bold") for line in broken(title, inner / BOLD, TITLE_SIZE, TITLE_LINES)),
        *((line, TEXT_SIZE, "normal") for line in broken(subtitle, inner, TEXT_SIZE, SUBTITLE_LINES)),
    ]
    numbers = sum(one.isdigit() or one in "+=<>" for one in caption)
    letter = NUMBERED if numbers > MANY * len(caption) else WORDY
    foot = broken(caption, inner * LETTER_WIDTH / letter, SMALL_SIZE, CAPTION_LINES)
    below = MARGIN + len(foot) * line_height(SMALL_SIZE)
    above = MARGIN + sum(line_height(size) for _, size, _ in head)
    figure = blank_figure(across, below + height + above)
    top = below + height + above - MARGIN
    for line, size, weight in head:
        _write(figure, line, top, size, weight)
        top -= line_height(size)
    for index, line in enumerate(foot):
        _write(figure, line, below - index * line_height(SMALL_SIZE), SMALL_SIZE, "normal")
    return figure, Box(0.0, below, across, height)


def _write(figure: Figure, line: str, top: float, size: float, weight: str) -> None:
    width, height = figure.get_size_inches() * MILLIMETRES_PER_INCH
    figure.text(
        MARGIN / width, top / height, plain(line), fontsize=size, fontweight=weight, va="top", ha="left"
    )
