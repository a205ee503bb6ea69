"""`tracer sightlines`: what lies along lines of sight through a product."""

import sys
from typing import Annotated

import typer

from tracer.commands.arguments import OVERWRITE, PRODUCT_FILE, argument, option
from tracer.commands.input_guard import about, refuse_inputs
from tracer.commands.next_command import name_next
from tracer.commands.output_file import check_output_file
from tracer.errors import InputError
from tracer.observe.gas import gas_of, without_the_rest
from tracer.observe.sightlines import CAUTION, Options, sightlines_of
from tracer.observe.table_files import ENDINGS, csv_text, table_bytes
from tracer.observe.tables import read_table
from tracer.product.lock import output_lock
from tracer.product.reading import load_all, open_product
from tracer.product.writing import save_bytes
from tracer.units import parse, quoted, si


def command(
    product: PRODUCT_FILE,
    rays: Annotated[
        str,
        argument(
            "RAYS",
            "CSV or ECSV: observer_x_km, observer_y_km, observer_z_km (Sun-fixed frame: +x to the Sun, +z north); "
            "and look_x, look_y, look_z, or tangent_altitude_km, tangent_latitude_deg, tangent_local_time_h; "
            "optional time.",
        ),
    ],
    output: Annotated[
        str | None,
        option(
            "OUT",
            f"The table; its ending says its kind: {', '.join(ENDINGS)}. Otherwise CSV to standard output.",
            "--output",
            "-o",
        ),
    ] = None,
    line: Annotated[
        list[str] | None,
        option("NAME", "An emission line of the product; may be repeated. Otherwise all of them."),
    ] = None,
    by_release: Annotated[
        bool,
        typer.Option("--by-release", help="Add columns for each release, _<release> behind their names."),
    ] = False,
    doppler_speed: Annotated[
        str | None,
        option(
            "SPEED",
            "Doppler speed b for the optical depth, such as '930 m/s'. Otherwise sqrt(2kT/m) of each release's "
            "law of speed.",
        ),
    ] = None,
    no_errors: Annotated[
        bool, typer.Option("--no-errors", help="Leave standard errors out, for a product without replicates.")
    ] = False,
    overwrite: OVERWRITE = False,
) -> None:
    """Add up column density, brightness and optical depth along lines of sight through a product.

    column_lit_m2 is the part outside the body's umbra; a host's is not counted.

    Outside the product's grid no gas is counted; outside_share is the part of
    the path through the traced space (up to the run's outer radius) out there.

    thick marks an optical depth above 0.3: light is scattered once only, so
    that true brightness is lower.

    A planning aid: flight rules and the instrument team's limits come first.
    """
    speed = _speed(doppler_speed)
    if output is not None:
        refuse_inputs(output, [product, rays])
        ending = check_output_file("--output", output, ENDINGS, overwrite, "table")
    table = read_table(rays)
    with open_product(product) as stored:
        ds = without_the_rest(stored, errors=not no_errors)
        load_all(ds, product)
        with about(product):
            gas = gas_of(ds, line, errors=not no_errors)
    with about(rays):
        made = sightlines_of(gas, table, Options(by_release, speed))
    if output is None:
        sys.stdout.write(csv_text(made))
    else:
        with output_lock(output):
            save_bytes(table_bytes(made, ending, "ray"), output, overwrite)
        typer.echo(output)
    typer.echo(CAUTION, err=True)
    name_next("plan", product, "PLAN.toml")


def _speed(text: str | None) -> float | None:
    if text is None:
        return None
    try:
        value = si(parse(text, "speed"))
    except ValueError as error:
        raise InputError(f"--doppler-speed: {error}") from None
    if not value > 0.0:
        raise InputError(f"--doppler-speed: {quoted(text)} is out of range; must be above 0 m s-1")
    return value
