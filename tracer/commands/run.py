"""`tracer run`: the main job."""

from pathlib import Path
from typing import Annotated

import typer

from tracer.commands.arguments import OVERWRITE, RUN_FILE, SETTINGS
from tracer.commands.budget_table import print_budget
from tracer.commands.next_command import name_next
from tracer.commands.progress import shown_progress
from tracer.commands.text_output import refuse_inputs
from tracer.engine.notes import scene_notes
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene, referenced_files
from tracer.engine.tracing import run
from tracer.errors import Interrupted
from tracer.product.lock import output_lock
from tracer.product.writing import check_output, save_product


def command(
    run_file: RUN_FILE,
    output: Annotated[
        str | None,
        typer.Option(
            "--output",
            "-o",
            metavar="OUT.nc",
            help="The product; by default the run file's name with .nc, in the current folder.",
            show_default=False,
        ),
    ] = None,
    workers: Annotated[
        int | None,
        typer.Option(
            min=1, help="Threads to trace on; by default all processors. The product does not depend on it."
        ),
    ] = None,
    overwrite: OVERWRITE = False,
    settings: SETTINGS = None,
) -> None:
    """Trace a run file's particles and write the product (netCDF)."""
    spec = load_run(run_file, settings or ())
    path = Path(run_file).stem + ".nc" if output is None else output
    scene = build_scene(spec)
    refuse_inputs(path, [run_file, *referenced_files(spec)])
    check_output(path, overwrite)
    for note in scene_notes(spec, scene):
        typer.echo(f"Note: {note}.", err=True)
    with output_lock(path):
        try:
            with shown_progress() as watch:
                product = run(spec, workers, watch)
        except KeyboardInterrupt:
            raise Interrupted(
                f"interrupted; {path} was not written. Run the same command to start again"
            ) from None
        save_product(product, path, overwrite)
    print_budget(product)
    attributes = product.attrs
    typer.echo(
        f"{attributes['flights']:,} flights in {attributes['wall_seconds']:.1f} s on {attributes['workers']} workers"
    )
    typer.echo(f"product: {path}")
    name_next("summary", path)
