"""`tracer plan`: a spectrometer observation along a path."""

import sys
from collections.abc import Iterator
from typing import Annotated

import numpy as np
import typer
from astropy.table import Table

from tracer.commands.arguments import OVERWRITE, PRODUCT_FILE, argument, option
from tracer.commands.input_guard import about, refuse_inputs
from tracer.commands.next_command import name_next
from tracer.commands.output_file import check_output_file
from tracer.constants import ASTRONOMICAL_UNIT
from tracer.observe.gas import Gas, gas_of, without_the_rest
from tracer.observe.plan import CAUTION, check_lines, lines_of, observation_of
from tracer.observe.plan_summary import PlanSummary, summarize
from tracer.observe.planspec.observer import TablePath
from tracer.observe.planspec.plan import PlanSpec, load_plan
from tracer.observe.table_files import ENDINGS, csv_text, table_bytes
from tracer.observe.tables import times
from tracer.product.lock import output_lock
from tracer.product.reading import load_all, open_product
from tracer.product.writing import save_bytes
from tracer.units import si

ELSEWHERE = 0.01
"""Relative difference of distances from the Sun that is worth a word."""

FLAG_WORDS = {
    "sun_keep_out": "Sun inside its keep-out (not to be commanded)",
    "body_keep_out": "body inside its keep-out (not to be commanded)",
    "body_in_field": "body in the field of view",
    "saturated": "saturated",
    "outside_grid": "more than a tenth of the gas may lie outside the product's grid",
    "thick": "optical depth above 0.3: true brightness is lower",
}


def command(
    product: PRODUCT_FILE,
    plan: Annotated[
        str,
        argument(
            "PLAN.toml",
            "The plan file: path of the observer, pointing, spectrometer; its keys stand in runs/README.md.",
        ),
    ],
    output: Annotated[
        str | None,
        option(
            "OUT",
            f"The table, a row per exposure; its ending says its kind: {', '.join(ENDINGS)}. Otherwise CSV to "
            "standard output, and the summary to standard error.",
            "--output",
            "-o",
        ),
    ] = None,
    overwrite: OVERWRITE = False,
) -> None:
    """Say what a spectrometer would count of a product's gas along its path, exposure by exposure.

    Each row is judged at the beginning of its exposure; snr_standard_error is
    that of the Monte Carlo alone.

    A planning aid: flight rules and the instrument team's limits come first.
    Rows inside the plan's keep-outs of Sun or body are marked do_not_command
    and must not be commanded.
    """
    spec = load_plan(plan)
    if output is not None:
        refuse_inputs(output, [product, plan, *_inputs(spec)])
        ending = check_output_file("--output", output, ENDINGS, overwrite, "table")
    with open_product(product) as stored:
        check_lines(spec, stored)
        ds = without_the_rest(stored)
        load_all(ds, product)
        with about(product):
            gas = gas_of(ds, lines_of(spec))
    made = observation_of(gas, spec)
    summary = summarize(made, spec.spectrometer.wanted_snr)
    if output is None:
        sys.stdout.write(csv_text(made))
    else:
        with output_lock(output):
            save_bytes(table_bytes(made, ending, "exposure"), output, overwrite)
    counts = _counts(summary, spec.spectrometer.wanted_snr)
    for line in (*counts, *_windows(made, summary), *_notes(spec, gas, made), CAUTION):
        typer.echo(line, err=output is None)
    if output is not None:
        typer.echo(output)
    name_next("sightlines", product, "RAYS.csv")


def _inputs(spec: PlanSpec) -> list[str]:
    """Return the files that a plan reads."""
    given = spec.observer
    names = [given.file] if isinstance(given, TablePath) else list(given.kernels)
    if spec.spectrometer.scattered_sunlight is not None:
        names.append(spec.spectrometer.scattered_sunlight.file)
    return [str(spec.folder / name) for name in names]


def _counts(summary: PlanSummary, wanted: float) -> Iterator[str]:
    yield (
        f"{summary.exposures} exposures: {summary.forbidden} not to be commanded, {summary.usable} usable, "
        f"{summary.reaching} of them with SNR at least {wanted:g}"
    )
    for flag, count in summary.flagged.items():
        if count:
            yield f"  {count:6d}  {FLAG_WORDS[flag]}"


def _windows(made: Table, summary: PlanSummary) -> Iterator[str]:
    if not summary.windows:
        yield "no window: no exposure is usable"
        return
    yield f"best windows{'' if summary.reaching else ', none with the wanted SNR'}"
    for window in summary.windows:
        first, last = made["time"][window.first], made["time"][window.last]
        yield (
            f"  {first} to {last}: rows {window.first + 1} to {window.last + 1}, best SNR {window.best_snr:.3g}, "
            f"all together {window.total_snr:.3g}"
        )


def _notes(spec: PlanSpec, gas: Gas, made: Table) -> Iterator[str]:
    exposure, steps = si(spec.spectrometer.exposure), np.diff(times(made))
    if steps.size and steps.min() < exposure:
        yield f"exposures of {exposure:g} s overlap: rows are as little as {steps.min():g} s apart"
    if gas.sun_distance is None:
        return
    product, path = gas.sun_distance / ASTRONOMICAL_UNIT, made["sun_distance_au"]
    if np.any(np.abs(path / product - 1.0) > ELSEWHERE):
        yield (
            f"the product is for {product:.4g} au from the Sun, the path runs from {path.min():.4g} to "
            f"{path.max():.4g} au, where gas and light differ"
        )
