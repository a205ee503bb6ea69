"""A spectrometer observation along a path: a row for each exposure, with what must not be commanded."""

import math
from typing import Any

import numpy as np
import xarray as xr
from astropy.table import Table
from numpy.typing import NDArray

from tracer.constants import ASTRONOMICAL_UNIT
from tracer.errors import InputError
from tracer.observe.field_light import Light, field_light
from tracer.observe.gas import Gas, gas_of
from tracer.observe.limits import limit_flags
from tracer.observe.path import ObserverPath, observer_path
from tracer.observe.planspec.observer import TablePath
from tracer.observe.planspec.plan import PlanSpec
from tracer.observe.planspec.spectrometer import SpectrometerTable
from tracer.observe.pointing import Attitude, attitude, field_samples
from tracer.observe.ray_table import KILOMETRE
from tracer.observe.sightlines import column_labels, geometry_columns
from tracer.observe.sights import (
    Floats,
    Sights,
    angle_between,
    length,
    toward_the_sun,
)
from tracer.observe.signal import count_rate, exposure_for, signal_to_noise, signal_to_noise_error
from tracer.observe.spread import standard_error
from tracer.observe.tables import numbers, read_table
from tracer.observe.true_anomaly import true_anomalies
from tracer.product.provenance import DISTRIBUTION, package_version
from tracer.units import si

Columns = dict[str, NDArray[Any]]

CAUTION = (
    "A planning aid, no command sequence: flight rules, keep-out angles and the limits of the instrument team come "
    "first. Rows marked do_not_command lie inside a keep-out of the plan file and must not be commanded."
)
ALLOWED = "only after flight rules and the instrument team's limits"
FORBIDDEN = "NOT to be commanded: "
UNKNOWN_SUN = 1e20
"""Distance [m] of a Sun of which nothing but the direction is known."""


def plan_observation(ds: xr.Dataset, plan: PlanSpec) -> Table:
    """Return what a spectrometer sees of a product's gas along a path, exposure by exposure.

    Parameters
    ----------
    ds : xarray.Dataset
        A product with replicates, as `tracer.open_product` or `tracer.run` gives it.
    plan : PlanSpec
        From `load_plan` or `parse_plan`.

    Returns
    -------
    astropy.table.Table
        A row for each exposure: `time`, place and look direction in the Sun-fixed frame, geometry of the look
        direction, `true_anomaly_deg`, `phase_angle_deg` (Sun - body - observer), `distance_km` (to the body's centre),
        `sun_distance_au`; `column_m2` and `brightness_<line>_rayleigh`, means over the field of view, with errors from
        the replicates; `counts` of the signal, `other_counts`, `snr`, `snr_standard_error` (from the Monte Carlo
        alone), `exposure_for_wanted_snr_s`; the flags `sun_keep_out`, `body_keep_out`, `body_in_field`, `saturated`,
        `outside_grid`, `thick`; `do_not_command` for rows inside a keep-out, and the same in words, `command`.

    Raises
    ------
    InputError
        A path, pointing or line that cannot be used; a product without replicates.
    """
    check_lines(plan, ds)
    return observation_of(gas_of(ds, lines_of(plan)), plan)


def _path_frame(plan: PlanSpec) -> str:
    """Return the name of the frame in which the plan gives directions."""
    if isinstance(plan.observer, TablePath):
        return plan.observer.inertial_frame or "Sun-fixed"
    return plan.observer.frame


def lines_of(plan: PlanSpec) -> list[str]:
    """Return the names of the lines in the spectrometer's band."""
    return [line.name for line in plan.spectrometer.line]


def observation_of(gas: Gas, plan: PlanSpec) -> Table:
    """Return what `plan_observation` does, of a product's gas that is already at hand, with the plan's lines."""
    path = observer_path(plan, gas.radius)
    stand = attitude(plan, path, gas.radius)
    light = field_light(gas, path, stand, plan.spectrometer)
    made = {
        **_geometry(gas, path, stand),
        **_counts(plan, gas, path, stand, light),
        **limit_flags(path.places, _suns(gas, path), stand, light, plan.spectrometer, gas.radius),
    }
    made["saturated"] = _saturated(made, plan.spectrometer)
    made["do_not_command"] = made["sun_keep_out"] | made["body_keep_out"]
    made["command"] = _command_words(made)
    table = Table(made)
    table.meta = {
        "title": plan.title,
        "source": f"{DISTRIBUTION} {package_version()}",
        "product_title": gas.title,
        "product_scene_hash": gas.scene,
        "frame": "Sun-fixed",
        "path_frame": _path_frame(plan),
        "caution": CAUTION,
    }
    return table


def check_lines(plan: PlanSpec, ds: xr.Dataset) -> None:
    """Raise InputError where the spectrometer counts a line that the product does not have."""
    known = [str(name) for name in ds["line_name"].values] if "line_name" in ds else []
    for number, line in enumerate(plan.spectrometer.line, 1):
        if line.name not in known:
            allowed = f"must be one of {', '.join(known)}" if known else "its gas has no lines with known g"
            raise InputError(
                f'{plan.file}: spectrometer.line[{number}].name: "{line.name}" is no line of the product; {allowed}'
            )


def _geometry(gas: Gas, path: ObserverPath, stand: Attitude) -> Columns:
    columns: Columns = {"time": path.times}
    for axis, values in zip("xyz", path.places.T, strict=True):
        columns[f"observer_{axis}_km"] = values / KILOMETRE
    for axis, values in zip("xyz", stand.look.T, strict=True):
        columns[f"look_{axis}"] = values
    columns |= geometry_columns(gas, Sights(path.places, stand.look))
    columns["sun_angle_deg"] = angle_between(stand.look, _suns(gas, path))
    distances = _sun_distances(gas, path)
    columns["true_anomaly_deg"] = true_anomalies(gas, path.sun_distances, len(path.places))
    columns["phase_angle_deg"] = angle_between(path.places, toward_the_sun(np.zeros_like(path.places), None))
    columns["distance_km"] = length(path.places) / KILOMETRE
    columns["sun_distance_au"] = distances / ASTRONOMICAL_UNIT
    return columns


def _sun_distances(gas: Gas, path: ObserverPath) -> Floats:
    """Return the body's distance from the Sun [m], as the path tells or else the product; NaN without either."""
    if path.sun_distances is not None:
        return path.sun_distances
    return np.full(len(path.places), math.nan if gas.sun_distance is None else gas.sun_distance)


def _suns(gas: Gas, path: ObserverPath) -> Floats:
    """Return vectors (N, 3) [m] from the observer to the Sun; one of unknown distance is as good as infinitely far."""
    distances = _sun_distances(gas, path)
    suns = np.zeros_like(path.places)
    suns[:, 0] = np.where(np.isnan(distances), UNKNOWN_SUN, distances)
    return np.asarray(suns - path.places)


def _counts(plan: PlanSpec, gas: Gas, path: ObserverPath, stand: Attitude, light: Light) -> Columns:
    instrument = plan.spectrometer
    batches, exposure = gas.replicate_batches, si(instrument.exposure)
    columns: Columns = {
        "column_m2": light.column,
        "column_standard_error_m2": standard_error(light.column_replicates, batches),
    }
    solid_angle = float(field_samples(instrument.field_of_view).solid_angles.sum())
    throughput = {line.name: line.throughput for line in instrument.line}
    signal, replicates = np.zeros(len(path.places)), np.zeros(light.column_replicates.shape)
    for label, i in column_labels(gas.lines, "line").items():
        columns[f"brightness_{label}_rayleigh"] = light.brightness[:, i]
        error = standard_error(light.brightness_replicates[:, i], batches)
        columns[f"brightness_{label}_standard_error_rayleigh"] = error
        chain = (si(instrument.collecting_area), solid_angle, throughput[gas.lines[i]])
        signal += count_rate(light.brightness[:, i], *chain)
        replicates += count_rate(light.brightness_replicates[:, i], *chain)
    other = _other_rate(plan, angle_between(stand.look, _suns(gas, path)))
    variance = instrument.reads * instrument.read_noise**2
    error = standard_error(replicates, batches)
    columns["counts"] = signal * exposure
    columns["counts_standard_error"] = error * exposure
    columns["other_counts"] = other * exposure
    columns["snr"] = signal_to_noise(signal, other, exposure, variance)
    columns["snr_standard_error"] = signal_to_noise_error(signal, error, other, exposure, variance)
    columns["exposure_for_wanted_snr_s"] = exposure_for(instrument.wanted_snr, signal, other, variance)
    return columns


def _other_rate(plan: PlanSpec, sun_angles: Floats) -> Floats:
    """Return the counts per second that are no signal: dark, background, scattered sunlight."""
    instrument = plan.spectrometer
    rate = np.full(len(sun_angles), si(instrument.dark_rate) + si(instrument.background_rate))
    if instrument.scattered_sunlight is None:
        return rate
    name = str(plan.folder / instrument.scattered_sunlight.file)
    table = read_table(name)
    try:
        angles = numbers(table, "sun_angle_deg", 0.0, 180.0)
        rates = numbers(table, "rate_per_s", 0.0)
        if np.any(np.diff(angles) <= 0.0):
            row = int(np.argmax(np.diff(angles) <= 0.0)) + 2
            raise InputError(
                f"row {row}, column sun_angle_deg: {angles[row - 1]:g} is not above the row before it"
            )
    except InputError as error:
        raise InputError(f"{name}: {error}") from None
    return np.asarray(rate + np.interp(sun_angles, angles, rates))


def _saturated(made: Columns, instrument: SpectrometerTable) -> NDArray[np.bool_]:
    total = made["counts"] + made["other_counts"]
    return np.asarray(total > (math.inf if instrument.full_well is None else instrument.full_well))


def _command_words(made: Columns) -> NDArray[Any]:
    reasons = {"sun_keep_out": "Sun inside its keep-out", "body_keep_out": "body inside its keep-out"}
    words = []
    for row in range(len(made["snr"])):
        broken = [text for flag, text in reasons.items() if made[flag][row]]
        words.append(FORBIDDEN + " and ".join(broken) if broken else ALLOWED)
    return np.array(words)
