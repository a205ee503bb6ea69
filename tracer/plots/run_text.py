"""What a product's own run file says, for curves and words beside its figures."""

import tomllib
from collections.abc import Mapping
from typing import Any

import xarray as xr

from tracer.catalogue.load import bodies, gases
from tracer.units import parse, si

Table = Mapping[str, Any]


def run_tables(product: xr.Dataset) -> Table:
    """Return the run file inside a product as tables; empty where it has none that can be read."""
    try:
        return tomllib.loads(str(product.attrs.get("run_file", "")))
    except (tomllib.TOMLDecodeError, RecursionError):
        return {}


def table(parent: Table, key: str) -> Table:
    """Return the table under `key`; empty where there is none."""
    inner = parent.get(key)
    return inner if isinstance(inner, dict) else {}


def entries(parent: Table, key: str) -> list[Table]:
    """Return the list of tables under `key`; empty where there is none."""
    inner = parent.get(key)
    return [one for one in inner if isinstance(one, dict)] if isinstance(inner, list) else []


def value(parent: Table, key: str, dimension: str, radius: float | None = None) -> float | None:
    """Return the quantity under `key` in SI units, angles in degrees; None where it is no such quantity."""
    try:
        return si(parse(parent.get(key), dimension), radius)
    except ValueError:
        return None


def atom_mass(run: Table) -> float | None:
    """Return the mass [kg] of an atom of the gas, None where it is not known."""
    gas = table(run, "gas")
    known = gases().get(str(gas.get("species")))
    return value(gas, "mass", "mass") or (known.mass if known else None)


def body_gm(run: Table) -> float | None:
    """Return the body's gravitational parameter [m3 s-2], None where it is not known."""
    body = table(run, "body")
    own = value(body, "gm", "gravitational parameter")
    known = bodies().get(str(body.get("name")))
    return own if own is not None else known.gm if known else None


def rotation_period(run: Table) -> float | None:
    """Return the body's sidereal rotation period [s], None where its ground does not turn."""
    body = table(run, "body")
    known = bodies().get(str(body.get("name")))
    return value(body, "rotation_period", "time") or (known.rotation_period if known else None)
