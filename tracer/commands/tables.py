"""Plain text in columns."""

import textwrap
from collections.abc import Sequence

import typer


def print_rows(rows: Sequence[tuple[str, ...]]) -> None:
    """Print rows of equal length as columns; the last is not padded."""
    widths = [max(len(row[i]) for row in rows) for i in range(len(rows[0]) - 1)]
    for row in rows:
        cells = [text.ljust(width) for text, width in zip(row, widths, strict=False)]
        typer.echo("  " + "  ".join([*cells, row[-1]]).rstrip())


def print_wrapped_rows(rows: Sequence[tuple[str, str]], width: int = 100) -> None:
    """Print pairs of a name and a text, the text broken at `width` characters and kept in its column."""
    indent = 4 + max(len(name) for name, _ in rows)
    for name, text in rows:
        typer.echo(
            textwrap.fill(
                text,
                width,
                initial_indent=f"  {name}".ljust(indent),
                subsequent_indent=" " * indent,
                break_on_hyphens=False,
            )
        )


def print_table(heads: Sequence[str], rows: Sequence[tuple[str, ...]], words: Sequence[int] = (0,)) -> None:
    """Print `rows` under `heads` of one or more lines each; columns numbered in `words` stand left, figures right."""
    head_lines = [head.split("\n") for head in heads]
    depth = max(len(lines) for lines in head_lines)
    above = [tuple(lines[i] if i < len(lines) else "" for lines in head_lines) for i in range(depth)]
    widths = [max(len(row[i]) for row in (*above, *rows)) for i in range(len(heads))]
    for row in (*above, tuple("-" * width for width in widths), *rows):
        cells = [
            text.ljust(width) if column in words else text.rjust(width)
            for column, (text, width) in enumerate(zip(row, widths, strict=True))
        ]
        typer.echo(("  " + "  ".join(cells)).rstrip())
