"""Points of a sweep as text: those to come, and what has become of their atoms."""

import math
from collections.abc import Iterator

import numpy as np
import typer
import xarray as xr

from tracer.commands.tables import print_rows, print_table
from tracer.engine.sweep.preparing import PreparedSweep
from tracer.product.layout import STANDARD_ERROR
from tracer.product.sweep_layout import NAME, swept_dimensions
from tracer.units import conversion_factor

MEGABYTE = 1e6
MOST_ROWS = 200
"""Points that are printed."""


def print_prepared(prepared: PreparedSweep) -> None:
    """Print the points of a sweep, and what they need."""
    sweep, points = prepared.sweep, prepared.points
    heads = ["point", *(axis.name for axis in sweep.axes), "particles", "memory"]
    rows = [
        (
            str(one.point.number),
            *(axis.words[place] for axis, place in zip(sweep.axes, one.point.places, strict=True)),
            f"{one.atoms:,}",
            f"{one.sizes.memory / MEGABYTE:.3g} MB",
        )
        for one in points[:MOST_ROWS]
    ]
    typer.echo(sweep.title)
    print_table(heads, rows, words=())
    _say_rest(len(points))
    print_rows(
        [
            ("points", f"{len(points)}, one after the other"),
            ("particles", f"at most {sum(one.atoms for one in points):,}, seeds as in the run file"),
            ("memory", f"about {prepared.memory / MEGABYTE:.3g} MB"),
            (
                "product",
                f"at most {prepared.product_size / MEGABYTE:.3g} MB on disk, twice that while it is put together",
            ),
        ]
    )


def print_point_budgets(ds: xr.Dataset) -> None:
    """Print, point by point, what share of the atoms of all releases ends how, with one standard error."""
    fates = [str(name) for name in ds["fate_name"].values]
    rates = ds["ledger"].sum("release").values.reshape(-1, len(fates))
    squares = (ds["ledger" + STANDARD_ERROR].fillna(0.0) ** 2).sum("release")
    errors = np.sqrt(squares.values).reshape(rates.shape)
    met = [number for number in range(len(fates)) if (rates[:, number] > 0.0).any()]
    heads = ["point", *axis_names(ds), *(f"{fates[number]} %" for number in met)]
    rows = []
    for number, values in enumerate(point_values(ds)):
        if number == MOST_ROWS:
            break
        whole = rates[number].sum()
        shares = (
            f"{100 * rates[number, fate] / whole:.4f} +- {100 * errors[number, fate] / whole:.4f}"
            for fate in met
        )
        rows.append((str(number + 1), *values, *shares))
    print_table(heads, rows, words=())
    _say_rest(int(np.prod([ds.sizes[axis] for axis in swept_dimensions(ds.attrs)])))


def axis_names(ds: xr.Dataset) -> list[str]:
    """Return the names of what varies in a sweep's product."""
    return [name.removesuffix(NAME) for name in _axis_variables(ds)]


def point_values(ds: xr.Dataset) -> Iterator[tuple[str, ...]]:
    """Yield each point's values as text, in the units of the sweep file."""
    dimensions = swept_dimensions(ds.attrs)
    columns = {name: _texts(ds, name) for name in _axis_variables(ds)}
    for place in np.ndindex(tuple(ds.sizes[axis] for axis in dimensions)):
        at = dict(zip(dimensions, place, strict=True))
        yield tuple(column[at[str(ds[name].dims[0])]] for name, column in columns.items())


def _axis_variables(ds: xr.Dataset) -> list[str]:
    return [str(name) for name in ds.variables if "run_file_key" in ds[name].attrs]


def _texts(ds: xr.Dataset, name: str) -> list[str]:
    values = ds[name].values
    if values.dtype.kind not in "fiu":
        return [str(value) for value in values]
    unit = str(ds[name].attrs.get("units", "1"))
    written = str(ds[name].attrs.get("written_unit", ""))
    factor = conversion_factor(unit, written) if written else None
    if written == "radii":
        factor = 1.0 / float(ds.attrs.get("body_radius", math.nan))
    shown = written if factor is not None else "" if unit == "1" else unit
    return [f"{value * (factor or 1.0):.6g} {shown}".rstrip() for value in values.astype(float)]


def _say_rest(points: int) -> None:
    if points > MOST_ROWS:
        typer.echo(f"  ... {points - MOST_ROWS} more points")
