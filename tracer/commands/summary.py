"""`tracer summary`: what is in a product."""

from typing import Any

import typer
import xarray as xr

from tracer.commands.arguments import JSON, PRODUCT_FILE
from tracer.commands.budget_table import print_budget
from tracer.commands.machine_output import print_json
from tracer.commands.next_command import name_next
from tracer.commands.tables import print_rows
from tracer.errors import InputError
from tracer.product.checksum import data_checksum
from tracer.product.layout import HOST_IMPACT_RATE, STANDARD_ERROR
from tracer.product.reading import load_all, open_product

SHOWN = (
    "title",
    "created",
    "source",
    "git_commit",
    "seed",
    "batches",
    "particles_per_batch",
    "flights",
    "kernel_seconds",
    "wall_seconds",
    "workers",
    "scene_hash",
    "run_hash",
    "data_checksum",
)


def command(product: PRODUCT_FILE, json: JSON = False) -> None:
    """Say what is in a product: scene, particle budget, errors, checksum (which is verified)."""
    with open_product(product) as ds:
        load_all(ds, product)
        if data_checksum(ds) != ds.attrs.get("data_checksum"):
            raise InputError(
                f"{product}: its data do not match its data_checksum; the file was changed or damaged"
            )
        if json:
            print_json({**{key: ds.attrs[key] for key in SHOWN if key in ds.attrs}, **_figures(ds)})
            return
        print_rows([(key, _text(ds.attrs[key])) for key in SHOWN if key in ds.attrs])
        print_budget(ds)
        typer.echo("variables, with the median relative standard error of their cells that were hit")
        print_rows(_variable_rows(ds))
    name_next("plot", product, "--what", "density", "-o", "density.png")


def _text(value: Any) -> str:
    return f"{value:.6g}" if isinstance(value, float) else str(value)


def _figures(ds: xr.Dataset) -> dict[str, Any]:
    releases = {}
    for name in ds["release_name"].values:
        one = ds.sel(release=name)
        releases[str(name)] = {
            "ledger": dict(zip(map(str, ds["fate_name"].values), one["ledger"].values.tolist(), strict=True)),
            "ledger_standard_error": dict(
                zip(
                    map(str, ds["fate_name"].values),
                    one["ledger_standard_error"].values.tolist(),
                    strict=True,
                )
            ),
            "roulette_balance": float(one["roulette_balance"]),
            "roulette_balance_standard_error": float(one["roulette_balance_standard_error"]),
            **_host_impacts(one),
            "mean_flights": float(one["mean_flights"]),
            "mean_life": float(one["mean_life"]),
        }
    errors = {name: _median_relative_error(ds, name) for name in _tallied(ds)}
    return {"releases": releases, "median_relative_standard_error": errors}


def _host_impacts(one: xr.Dataset) -> dict[str, float]:
    """Return the rate of atoms that hit the host planet, with its error; nothing where there is none."""
    names = (HOST_IMPACT_RATE, HOST_IMPACT_RATE + STANDARD_ERROR)
    return {name: float(one[name]) for name in names if name in one}


def _tallied(ds: xr.Dataset) -> list[str]:
    return [str(name) for name in ds.data_vars if f"{name}_standard_error" in ds]


def _variable_rows(ds: xr.Dataset) -> list[tuple[str, ...]]:
    rows: list[tuple[str, ...]] = []
    for name in _tallied(ds):
        error = _median_relative_error(ds, name)
        precision = "never hit" if error != error else f"{100 * error:.3g} %"
        rows.append((name, str(ds[name].attrs["units"]), " x ".join(map(str, ds[name].dims)), precision))
    return rows


def _median_relative_error(ds: xr.Dataset, name: str) -> float:
    hit = ds[name].where(ds[name] > 0.0)
    if not bool(hit.notnull().any()):
        return float("nan")
    return float((ds[f"{name}_standard_error"] / hit).median())
