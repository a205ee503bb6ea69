"""`tracer merge`: products of one scene put together."""

from contextlib import ExitStack
from typing import Annotated

import typer

from tracer.commands.arguments import OVERWRITE, argument, option
from tracer.commands.budget_table import print_budget
from tracer.commands.input_guard import refuse_inputs
from tracer.commands.next_command import name_next
from tracer.product.lock import output_lock
from tracer.product.merging import merged_product
from tracer.product.reading import open_product
from tracer.product.writing import check_output, save_product


def command(
    products: Annotated[
        list[str],
        argument("PRODUCT.nc...", "Products of one scene: other seeds, or other batches of one seed."),
    ],
    output: Annotated[str, option("OUT.nc", "The merged product.", "--output", "-o")],
    overwrite: OVERWRITE = False,
) -> None:
    """Merge products of one scene, made with other seeds or batches, into one with smaller errors."""
    refuse_inputs(output, products)
    check_output(output, overwrite)
    with output_lock(output), ExitStack() as open_files:
        opened = [(name, open_files.enter_context(open_product(name))) for name in products]
        merged = merged_product(opened)
        save_product(merged, output, overwrite)
        print_budget(merged)
        attributes = merged.attrs
        typer.echo(
            f"{attributes['batches']} batches of {len(products)} products: {attributes['batch_ranges']}"
        )
        typer.echo(_replicate_words(len(attributes.get("replicate_batches", ()))))
    typer.echo(f"product: {output}")
    name_next("summary", output)


def _replicate_words(groups: int) -> str:
    if not groups:
        return "no replicates: not every product keeps them, so errors of sums are not to be had"
    return f"{groups} replicates, put together in single precision"
