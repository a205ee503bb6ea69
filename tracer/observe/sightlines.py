"""Columns, brightness and optical depth along lines of sight, as a table."""

import re
from collections.abc import Mapping, Sequence
from typing import Any, NamedTuple

import numpy as np
import xarray as xr
from astropy.table import Table
from numpy.typing import NDArray

from tracer.constants import RAYLEIGH
from tracer.errors import InputError
from tracer.observe.gas import Gas, gas_of
from tracer.observe.integration import blocks, integrals_along
from tracer.observe.optical_depth import THICK, optical_depth
from tracer.observe.ray_table import KILOMETRE, sights_of
from tracer.observe.sights import Geometry, Sights, geometry, share_outside
from tracer.observe.spread import standard_error
from tracer.product.provenance import DISTRIBUTION, package_version
from tracer.units import quoted

Floats = NDArray[np.float64]
Columns = dict[str, NDArray[Any]]

CAUTION = (
    "A planning aid: flight rules, keep-out angles and the instrument team's limits come first. Outside the product's "
    "grid no gas is counted."
)
_NOT_IN_A_NAME = re.compile(r"[^A-Za-z0-9_]")


class Options(NamedTuple):
    """What a table of sight lines is to hold.

    `by_release` adds columns for each release; `doppler_speed` [m s-1] replaces what the laws of release tell.
    """

    by_release: bool = False
    doppler_speed: float | None = None


def sightlines(
    ds: xr.Dataset,
    rays: Table | Mapping[str, Any],
    *,
    lines: Sequence[str] | None = None,
    by_release: bool = False,
    doppler_speed: float | None = None,
    errors: bool = True,
) -> Table:
    """Return columns, brightness and optical depth along lines of sight.

    Parameters
    ----------
    ds : xarray.Dataset
        A product, as `tracer.open_product` or `tracer.run` gives it.
    rays : astropy.table.Table or mapping of columns
        `observer_x_km`, `observer_y_km`, `observer_z_km` in the Sun-fixed frame; with `look_x`, `look_y`, `look_z`, or
        `tangent_altitude_km`, `tangent_latitude_deg`, `tangent_local_time_h`; `time` and further columns are carried
        over.
    lines : sequence of str, optional
        Emission lines, by their names in the product; all where absent.
    by_release : bool
        Whether columns for each release follow those of their sum, with `_<release>` behind their names.
    doppler_speed : float, optional
        Doppler speed b [m s-1] for the optical depth; where absent that of each release's law: sqrt(2kT/m).
    errors : bool
        Whether standard errors are wanted; they need the product's replicates.

    Returns
    -------
    astropy.table.Table
        The rays with `tangent_altitude_km`, `tangent_latitude_deg`, `tangent_local_time_h`, `solar_zenith_angle_deg`
        (at the tangent point), `sun_angle_deg`, `ends_at_body`, `column_m2`, `column_standard_error_m2`,
        `column_lit_m2` (outside the umbra), `brightness_<line>_rayleigh`, `brightness_<line>_standard_error_rayleigh`,
        `optical_depth_<line>` (NaN where the line's strength is not in the catalogue), `thick` (any depth above 0.3)
        and `outside_share`, the part of the path through the traced space that lies outside the grid.

    Raises
    ------
    InputError
        A bad table, with row and column; an unknown line; errors wanted of a product without replicates.
    """
    gas = gas_of(ds, lines, errors)
    return sightlines_of(gas, as_table(rays), Options(by_release, doppler_speed))


def sightlines_of(gas: Gas, rays: Table, options: Options) -> Table:
    """Return what `sightlines` does, of a product's gas that is already at hand."""
    sights = sights_of(rays, gas.radius)
    return _joined(rays, {**geometry_columns(gas, sights), **light_columns(gas, sights, options)}, gas)


def as_table(given: Table | Mapping[str, Any]) -> Table:
    """Return a table of columns, InputError where it is none or has no rows."""
    try:
        table = Table(given if isinstance(given, Table) else dict(given))
    except (TypeError, ValueError) as error:
        raise InputError(f"not a table of columns: {error}") from None
    if not len(table):
        raise InputError("the table has no rows")
    return table


def geometry_columns(gas: Gas, sights: Sights) -> Columns:
    """Return the columns of geometry of the sights, in the units of their names."""
    found: Geometry = geometry(sights, gas.radius, gas.sun_distance)
    return {
        "tangent_altitude_km": found.tangent_altitude / KILOMETRE,
        "tangent_latitude_deg": found.tangent_latitude,
        "tangent_local_time_h": found.tangent_local_time,
        "solar_zenith_angle_deg": found.solar_zenith_angle,
        "sun_angle_deg": found.sun_angle,
        "ends_at_body": found.ends_at_body,
    }


def light_columns(gas: Gas, sights: Sights, options: Options) -> Columns:
    """Return the columns of gas and light of the sights, in the units of their names."""
    labels = column_labels(gas.releases, "release") if options.by_release else {}
    line_labels = column_labels(gas.lines, "line")
    made: Columns = {}
    for place, some in blocks(sights):
        for name, values in _block(gas, some, options, labels, line_labels).items():
            made.setdefault(name, np.empty(len(sights.start), values.dtype))[place] = values
    return made


def doppler_speeds(gas: Gas, given: float | None) -> Floats:
    """Return the Doppler speed [m s-1] of each release, NaN where it is not known."""
    if given is not None:
        return np.full(len(gas.releases), given)
    return np.array([gas.facts.doppler_speeds.get(name, np.nan) for name in gas.releases])


def _block(
    gas: Gas, sights: Sights, options: Options, labels: Mapping[str, int], line_labels: Mapping[str, int]
) -> Columns:
    found = integrals_along(gas, sights)
    speeds = doppler_speeds(gas, options.doppler_speed)
    every: dict[str, slice] = {
        "": slice(None),
        **{f"_{label}": slice(i, i + 1) for label, i in labels.items()},
    }
    made: Columns = {}
    thick = np.zeros(len(sights.start), dtype=bool)

    def put(name: str, values: Floats, replicates: Floats | None, unit: str) -> None:
        """Note a quantity (N, R), and its error from replicates (N, R, G), of all releases and of each."""
        for ending, which in every.items():
            made[f"{name}{unit}{ending}"] = values[:, which].sum(axis=1)
            if replicates is not None and gas.has_errors:
                spread = standard_error(replicates[:, which].sum(axis=1), gas.replicate_batches)
                made[f"{name}_standard_error{unit}{ending}"] = spread

    put("column", found.column, found.column_replicates, "_m2")
    put("column_lit", found.column_lit, None, "_m2")
    for label, i in line_labels.items():
        photons, replicates = found.photons[:, i] / RAYLEIGH, found.photon_replicates[:, i] / RAYLEIGH
        put(f"brightness_{label}", photons, replicates, "_rayleigh")
    for label, i in line_labels.items():
        depth = optical_depth(found.column, gas.line_facts[i], speeds)
        put(f"optical_depth_{label}", depth, None, "")
        thick |= made[f"optical_depth_{label}"] > THICK
    made["thick"] = thick
    made["outside_share"] = share_outside(sights, gas.radius, gas.top_radius, gas.traced_radius)
    return made


def column_labels(names: Sequence[str], what: str) -> dict[str, int]:
    """Return the numbers of `names` by what stands for them in the names of columns; `what` they are, for messages.

    Raises
    ------
    InputError
        Two names that become the same.
    """
    labels: dict[str, int] = {}
    for number, name in enumerate(names):
        label = _NOT_IN_A_NAME.sub("_", name)
        if label in labels:
            raise InputError(
                f"{what} {quoted(name)} and {what} {quoted(names[labels[label]])} would have the same columns, "
                f"_{label}; rename one of them in the run file"
            )
        labels[label] = number
    return labels


def _joined(table: Table, made: Columns, gas: Gas) -> Table:
    """Return the given table with the results behind it; tangent points that were given stay as they were given."""
    given = set(table.colnames) & set(made)
    clash = sorted(given - {"tangent_altitude_km", "tangent_latitude_deg", "tangent_local_time_h"})
    if clash:
        raise InputError(
            f"column {clash[0]}: is one of the results; leave it out, or give it another name ({', '.join(clash)})"
        )
    joined = table.copy()
    for name, values in made.items():
        if name not in given:
            joined[name] = values
    joined.meta = {
        **table.meta,
        "source": f"{DISTRIBUTION} {package_version()}",
        "product_title": gas.title,
        "product_scene_hash": gas.scene,
        "frame": "Sun-fixed",
        "caution": CAUTION,
    }
    return joined
