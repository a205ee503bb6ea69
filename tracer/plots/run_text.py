"""What a product's own run file says, for curves and words beside its figures."""

import xarray as xr

from tracer.catalogue.load import bodies, gases
from tracer.product.run_file import Table, table, tables_of, value


def run_tables(product: xr.Dataset) -> Table:
    """Return the run file inside a product as tables; empty where it has none that can be read."""
    return tables_of(str(product.attrs.get("run_file", "")))


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
