"""A comparison of products with a measured profile, in words."""

from collections.abc import Iterator

import typer

from tracer.commands.tables import print_table
from tracer.observe.fit.result import Comparison, Estimate
from tracer.units import conversion_factor

SHOWN_UNITS = {"temperature": ("K", "K"), "binding_energy": ("J", "eV"), "cutoff_energy": ("J", "eV")}
"""Unit of a law's parameter, and the one it is read in."""
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
        yield _row(f"{name}: rate", rate, 1.0, "s-1")
    for name, parameters in found.parameters.items():
        for key, estimate in parameters.items():
            given, shown = SHOWN_UNITS[key]
            yield _row(f"{name}: {key}", estimate, conversion_factor(given, shown) or 1.0, shown)
    if found.background is not None:
        yield _row("background", found.background, 1.0, found.points.unit)


def _row(label: str, estimate: Estimate, factor: float, unit: str) -> tuple[str, ...]:
    best, low68, high68, low95, high95 = (f"{factor * end:.4g}" for end in estimate)
    return label, best, f"{low68} to {high68}", f"{low95} to {high95}", unit
