"""A comparison of products with a measured profile, in words."""

from collections.abc import Iterator

import typer

from tracer.commands.tables import print_table
from tracer.observe.fit.result import Comparison, Estimate, as_read

HEADS = ("", "best", "68 %", "95 %", "unit")


def print_comparison(found: Comparison) -> None:
    """Print what was compared, the fitted numbers with their ranges, and what is to be said about them."""
    points = found.points
    limits = int(points.upper.sum())
    more = f", {limits} of them upper limits" if limits else ""
    typer.echo(f"{found.title}: {found.what}, {len(points.value)} points{more}, {found.view}")
    print_table(HEADS, list(_rows(found)), words=(0, 4))
    for name, rate in found.held_rates.items():
        typer.echo(f"  rate of '{name}' held at {rate:.4g} s-1")
    for words in found.statements:
        typer.echo(words)
    for words in found.warnings:
        typer.echo(f"warning: {words}")


def _rows(found: Comparison) -> Iterator[tuple[str, ...]]:
    for name, rate in found.rates.items():
        yield _row(f"{name}: rate", rate, "s-1")
    for name, parameters in found.parameters.items():
        for key, estimate in parameters.items():
            yield _row(f"{name}: {key}", *as_read(key, estimate))
    if found.background is not None:
        yield _row("background", found.background, found.points.unit)


def _row(label: str, estimate: Estimate, unit: str) -> tuple[str, ...]:
    best, low68, high68, low95, high95 = (f"{end:.4g}" for end in estimate)
    return label, best, f"{low68} to {high68}", f"{low95} to {high95}", unit
