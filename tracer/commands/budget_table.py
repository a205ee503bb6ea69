"""The particle budget as text."""

import math

import typer
import xarray as xr

from tracer.commands.tables import print_rows
from tracer.fate import Fate
from tracer.product.layout import HOST_IMPACT_RATE, STANDARD_ERROR

PLAIN_WORDS = {
    "captured": "captured at the surface",
    "escaped": "escaped through the outer radius",
    "ionized": "ionised by sunlight",
    "other_loss": "lost in flight otherwise",
    "age_limit": "still alive at the age limit",
    "unresolved": "given up by the propagator",
}


OTHER_LOSS = Fate.OTHER_LOSS.label
ROULETTE_WORDS = "dropped by roulette on balance, by chance"
HOST_WORDS = "of all hit the host planet, part of what is lost otherwise"


def print_budget(product: xr.Dataset) -> None:
    """Print each release's budget: what share of its atoms ends how, with one standard error."""
    for name in product["release_name"].values:
        one = product.sel(release=name)
        balance = float(one["roulette_balance"])
        rate = float(one["ledger"].sum()) - balance
        typer.echo(f"release {str(name)!r}: {rate:.4g} atoms per second, of which")
        rows = []
        for fate in product["fate_name"].values:
            share = float(one["ledger"].sel(fate=fate)) / rate
            if share > 0.0:
                error = float(one["ledger_standard_error"].sel(fate=fate)) / rate
                rows.append((f"{100 * share:9.4f} %", _error(error), PLAIN_WORDS[str(fate)]))
            if fate == OTHER_LOSS and HOST_IMPACT_RATE in one:
                share = float(one[HOST_IMPACT_RATE]) / rate
                error = float(one[HOST_IMPACT_RATE + STANDARD_ERROR]) / rate
                rows.append((f"{100 * share:9.4f} %", _error(error), HOST_WORDS))
        if balance != 0.0:
            error = float(one["roulette_balance_standard_error"]) / rate
            rows.append((f"{-100 * balance / rate:9.4f} %", _error(error), ROULETTE_WORDS))
        print_rows(rows)
        life, flights = float(one["mean_life"]), float(one["mean_flights"])
        typer.echo(f"  mean life {life:.4g} s on {flights:.4g} flights")


def _error(error: float) -> str:
    return "" if math.isnan(error) else f"+- {100 * error:.4f} %"
