"""Plain text in columns."""

from collections.abc import Sequence

import typer


def print_rows(rows: Sequence[tuple[str, ...]]) -> None:
    """Print rows of equal length as columns; the last is not padded."""
    widths = [max(len(row[i]) for row in rows) for i in range(len(rows[0]) - 1)]
    for row in rows:
        cells = [text.ljust(width) for text, width in zip(row, widths, strict=False)]
        typer.echo("  " + "  ".join([*cells, row[-1]]).rstrip())
