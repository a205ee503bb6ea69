"""`tracer summary`: what is in a product."""

from typing import Any

import typer
import xarray as xr

from tracer.commands.arguments import JSON, PRODUCT_FILE
from tracer.commands.budget_table import print_budget
from tracer.commands.machine_output import print_json
from tracer.commands.next_command import name_next
from tracer.commands.sweep_tables import print_point_budgets
from tracer.commands.tables import print_rows, print_wrapped_rows
from tracer.errors import InputError
from tracer.plots.moving import motion_of, time_words
from tracer.product.checksum import data_checksum
from tracer.product.layout import HOST_IMPACT_RATE, STANDARD_ERROR
from tracer.product.reading import is_sweep, load_all, open_product, open_sweep
from tracer.product.sweep_layout import swept_dimensions

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
    "motion",
    "event_window",
    "host",
    "phase_angle",
    "scene_hash",
    "run_hash",
    "data_checksum",
)

VELOCITY_UNIT = "m s-1"
UNKNOWN = "unknown"
SHOWN_OF_SWEEPS = (
    *("title", "created", "source", "git_commit", "swept_dimensions", "points", "flights", "kernel_seconds"),
    *("wall_seconds", "workers", "sweep_hash", "data_checksum"),
)


def command(product: PRODUCT_FILE, json: JSON = False) -> None:
    """Say what is in a product: scene, particle budget, errors, checksum (which is verified)."""
    if is_sweep(product):
        _sweep(product, json)
        return
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
        print_wrapped_rows(list(time_words(ds)))
        print_budget(ds)
        typer.echo("variables, with the median relative standard error of their cells that were hit")
        print_rows(_variable_rows(ds))
    name_next("plot", product, "--what", "density", "-o", "density.png")


def _sweep(product: str, json: bool) -> None:
    """Say what is in the product of a sweep, its points and their budgets."""
    with open_sweep(product) as ds:
        try:
            found = data_checksum(ds)
        except (OSError, RuntimeError, ValueError) as error:
            raise InputError(f"{product}: is damaged: its data cannot be read ({error})") from None
        if found != ds.attrs.get("data_checksum"):
            raise InputError(
                f"{product}: its data do not match its data_checksum; the file was changed or damaged"
            )
        known = {key: ds.attrs[key] for key in SHOWN_OF_SWEEPS if key in ds.attrs}
        if json:
            print_json({**known, "swept": _swept(ds)})
            return
        print_rows([(key, _text(value)) for key, value in known.items()])
        print_point_budgets(ds)
        print_rows(
            [
                (name, str(ds[name].attrs["units"]), " x ".join(map(str, ds[name].dims)))
                for name in _tallied(ds)
            ]
        )
    name_next("sweep", product, "--point", "1", "-o", "point-1.nc")


def _swept(ds: xr.Dataset) -> dict[str, Any]:
    """Return what varies, with its values in SI units, and each fate's rate over the swept dimensions and releases."""
    axes = [name for name in map(str, ds.variables) if "run_file_key" in ds[name].attrs]
    fates = {str(fate): ds["ledger"].sel(fate=fate).values.tolist() for fate in ds["fate_name"].values}
    return {
        "dimensions": list(swept_dimensions(ds.attrs)),
        "values": {name: ds[name].values.tolist() for name in axes},
        "ledger": fates,
    }


def _text(value: Any) -> str:
    return f"{value:.6g}" if isinstance(value, float) else str(value)


def _figures(ds: xr.Dataset) -> dict[str, Any]:
    releases = {}
    motion = motion_of(ds)
    for place, name in enumerate(ds["release_name"].values):
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
        if motion is not None:
            releases[str(name)]["share_older_than_age_limit"] = float(motion.older[place])
    errors = {
        name: _median_relative_error(ds, name)
        for name in _tallied(ds)
        if ds[name].attrs["units"] != VELOCITY_UNIT
    }
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
        unit = str(ds[name].attrs["units"])
        rows.append((name, unit, " x ".join(map(str, ds[name].dims)), _precision(ds, name, unit)))
    return rows


def _precision(ds: xr.Dataset, name: str, unit: str) -> str:
    """Return how well a variable is known: relatively, but a velocity, which may be any side of 0, as it is."""
    if unit == VELOCITY_UNIT:
        error = float(ds[f"{name}_standard_error"].median())
        return UNKNOWN if error != error else f"{error:.3g} {unit}"
    error = _median_relative_error(ds, name)
    return "never hit" if error != error else f"{100 * error:.3g} %"


def _median_relative_error(ds: xr.Dataset, name: str) -> float:
    hit = ds[name].where(ds[name] > 0.0)
    if not bool(hit.notnull().any()):
        return float("nan")
    return float((ds[f"{name}_standard_error"] / hit).median())
