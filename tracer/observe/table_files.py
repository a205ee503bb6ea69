"""Tables of results into files: CSV, ECSV with units, or netCDF."""

import csv
import io
import re
from typing import Any

import netCDF4
from astropy.table import Table

from tracer.errors import InputError
from tracer.observe.tables import column_values

ENDINGS = (".csv", ".ecsv", ".nc")

UNITS = (
    ("_km", "km"),
    ("_deg", "deg"),
    ("_rayleigh", "Rayleigh"),
    ("_m2", "m-2"),
    ("_au", "AU"),
    ("_h", "h"),
    ("_s", "s"),
)
"""Units by the ending of a column's name; `_m2` is per square metre."""

CF_UNITS = {"Rayleigh": "1e10 m-2 s-1", "AU": "149597870700 m", "deg": "degree"}
"""What the standard library of units for netCDF does not know by the same name."""
_NOT_IN_NETCDF = re.compile(r"[^A-Za-z0-9_]")


def table_bytes(table: Table, ending: str, row: str) -> bytes:
    """Return a table as the content of a file; `row` names the dimension of a netCDF file."""
    if ending == ".nc":
        return _netcdf(table, row)
    return (_ecsv(table) if ending == ".ecsv" else csv_text(table)).encode("utf-8")


def csv_text(table: Table) -> str:
    """Return a table as CSV: numbers with all their digits, `True` and `False`."""
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(table.colnames)
    writer.writerows(zip(*(column_values(table[name]).tolist() for name in table.colnames), strict=True))
    return text.getvalue()


def unit_of(name: str) -> str | None:
    """Return the unit that a column's name ends with, releases' columns included; None where it has none."""
    for ending, unit in UNITS:
        if name.endswith(ending) or (ending in ("_m2", "_rayleigh") and f"{ending}_" in name):
            return unit
    return None


def _ecsv(table: Table) -> str:
    plain = Table({name: column_values(table[name]) for name in table.colnames}, meta=table.meta)
    for name in plain.colnames:
        if plain[name].dtype.kind == "f":
            plain[name].unit = unit_of(name)
    head = io.StringIO()
    # The rows by the writer of plain CSV, which is many times faster.
    plain[:0].write(head, format="ascii.ecsv", delimiter=",")
    header = [line for line in head.getvalue().splitlines() if line.startswith("#")]
    return "\n".join(header) + "\n" + csv_text(table)


def _netcdf(table: Table, row: str) -> bytes:
    _refuse_equal_names(table)
    file = netCDF4.Dataset("table.nc", "w", format="NETCDF4", memory=1)
    file.createDimension(row, len(table))
    file.setncatts({"Conventions": "CF-1.11", **{key: str(value) for key, value in table.meta.items()}})
    for name in table.colnames:
        values = column_values(table[name])
        text = values.dtype.kind == "U"
        kind: Any = str if text else "i1" if values.dtype.kind == "b" else values.dtype
        options: dict[str, Any] = {} if text else {"zlib": True, "complevel": 1, "shuffle": True}
        stored = file.createVariable(_NOT_IN_NETCDF.sub("_", name), kind, (row,), **options)
        stored.long_name = _words(name)
        unit = unit_of(name)
        if values.dtype.kind == "f":
            stored.units = "s" if name == "time" else CF_UNITS.get(unit, unit) if unit else "1"
        stored[:] = values.astype(object) if text else values.astype(kind)
    return bytes(file.close())


def _refuse_equal_names(table: Table) -> None:
    taken: dict[str, str] = {}
    for name in table.colnames:
        first = taken.setdefault(_NOT_IN_NETCDF.sub("_", name), name)
        if first != name:
            raise InputError(
                f"columns {first} and {name}: have one name, {_NOT_IN_NETCDF.sub('_', name)}, in netCDF; rename one"
            )


def _words(name: str) -> str:
    for ending, _ in UNITS:
        name = name.replace(ending, "") if name.endswith(ending) else name
    return name.replace("_", " ")
