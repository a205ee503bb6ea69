"""`tracer report`: one page about a product, to hand round."""

from pathlib import Path
from typing import Annotated

import typer

from tracer.commands.arguments import OVERWRITE, PRODUCT_FILE, argument
from tracer.commands.input_guard import refuse_inputs
from tracer.commands.next_command import name_next
from tracer.commands.output_file import check_output_file
from tracer.errors import InputError
from tracer.plots.page.document import report_page
from tracer.plots.plan_table import read_plan
from tracer.product.checksum import data_checksum
from tracer.product.lock import output_lock
from tracer.product.reading import load_all, open_product
from tracer.product.writing import save_bytes

ENDINGS = (".html", ".htm")


def command(
    product: PRODUCT_FILE,
    plan: Annotated[
        str | None,
        argument("PLAN-OUT", "The table that `tracer plan` wrote: .ecsv, .csv or .nc."),
    ] = None,
    output: Annotated[
        str, typer.Option("--output", "-o", metavar="FILE.html", help="The page.")
    ] = "report.html",
    overwrite: OVERWRITE = False,
) -> None:
    """Write one HTML page that needs no network: scene, budget, figures, plan, cautions, provenance."""
    refuse_inputs(output, [product, *([plan] if plan is not None else [])])
    check_output_file("--output", output, ENDINGS, overwrite, "page")
    planned = None if plan is None else read_plan(plan)
    with output_lock(output), open_product(product) as ds:
        load_all(ds, product)
        if data_checksum(ds) != ds.attrs.get("data_checksum"):
            raise InputError(
                f"{product}: its data do not match its data_checksum; the file was changed or damaged"
            )
        try:
            page = report_page(ds, Path(product).name, planned, "" if plan is None else Path(plan).name)
        except InputError as error:
            raise InputError(f"{product}: {error}") from None
        save_bytes(page.encode("utf-8", "replace"), output, overwrite)
    typer.echo(output)
    if plan is None:
        name_next("plan", product, "PLAN.toml", "-o", "plan.ecsv")
