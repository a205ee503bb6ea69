"""`tracer run`: the main job."""

from pathlib import Path
from typing import Annotated, NamedTuple

import typer
import xarray as xr

from tracer.commands.arguments import CLUSTER, LOG, RUN_FILE, SETTINGS, WORKERS, Tracing, option
from tracer.commands.budget_table import print_budget
from tracer.commands.event_log import event_log
from tracer.commands.input_guard import refuse_inputs
from tracer.commands.next_command import name_next, resuming_command
from tracer.commands.progress import shown_progress
from tracer.engine.checkpoint_slots import Checkpoints
from tracer.engine.executors.choice import chosen_executor
from tracer.engine.notes import scene_notes
from tracer.engine.planning import Plan, make_plan
from tracer.engine.progress import Note
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene, referenced_files
from tracer.engine.tasks import parse_batches
from tracer.engine.tracing import run
from tracer.errors import InputError, Interrupted, TracerError
from tracer.product.lock import output_lock
from tracer.product.outside_velocity import outside_notes
from tracer.product.reading import open_product
from tracer.product.writing import check_output, save_product


class Job(NamedTuple):
    """What was asked for, put together from the options."""

    plan: Plan
    path: str
    share: bool
    tracing: Tracing
    again: str
    """The command that goes on after an interruption."""


def command(
    run_file: RUN_FILE,
    output: Annotated[
        str | None,
        option(
            "OUT.nc",
            "The product; by default the run file's name with .nc, in the current folder.",
            "--output",
            "-o",
        ),
    ] = None,
    workers: WORKERS = None,
    overwrite: Annotated[
        bool, typer.Option("--overwrite", help="Replace an existing product; drop an existing checkpoint.")
    ] = False,
    resume: Annotated[
        bool, typer.Option("--resume", help="Go on from the checkpoint of an interrupted run.")
    ] = False,
    batches: Annotated[
        str | None,
        option(
            "FIRST:STOP", "A share: these batches alone, counted from 0; tracer merge puts shares together."
        ),
    ] = None,
    cluster: CLUSTER = None,
    log: LOG = None,
    settings: SETTINGS = None,
) -> None:
    """Trace a run file's particles and write the product (netCDF)."""
    tracing = Tracing(workers, cluster, log, settings or (), overwrite, resume)
    spec = load_run(run_file, tracing.settings)
    path = Path(run_file).stem + ".nc" if output is None else output
    share = None if batches is None else parse_batches(batches)
    plan = make_plan(spec, build_scene(spec), share)
    words = ["run", run_file, "-o", path, *(() if batches is None else ("--batches", batches))]
    job = Job(plan, path, share is not None, tracing, resuming_command(*words, tracing=tracing))
    for name in (path, log):
        if name is not None:
            refuse_inputs(name, [run_file, *referenced_files(spec)])
    with event_log(log) as note:
        _do(job, note)


def _do(job: Job, note: Note) -> None:
    if not (job.tracing.resume and Path(job.path).exists()):
        check_output(job.path, job.tracing.overwrite)
    for text in scene_notes(job.plan.spec, job.plan.scene):
        note("note", f"Note: {text}.")
    with output_lock(job.path):
        checkpoints = Checkpoints(job.path, job.tracing.resume, note)
        checkpoints.remove_leftovers()
        if job.tracing.resume and Path(job.path).exists() and _is_done(job, checkpoints):
            return
        _check_checkpoints(job, checkpoints)
        product = _trace_and_save(job, checkpoints, note)
    print_budget(product)
    attributes = product.attrs
    typer.echo(
        f"{attributes['flights']:,} flights in {attributes['wall_seconds']:.1f} s on {attributes['workers']} workers"
    )
    _say_how_it_stopped(product)
    for text in outside_notes(product):
        note("note", f"Note: {text}.")
    typer.echo(f"product: {job.path}")
    name_next(*(("merge", job.path, "...", "-o", "merged.nc") if job.share else ("summary", job.path)))


def _is_done(job: Job, checkpoints: Checkpoints) -> bool:
    """Whether the output is the product of this very run already; its checkpoints are of no more use then."""
    try:
        with open_product(job.path) as ds:
            same = job.plan.is_told_by(ds.attrs)
    except InputError:
        same = False
    if same:
        checkpoints.remove()
        typer.echo(f"product: {job.path} is complete already: nothing to do")
        name_next("summary", job.path)
        return True
    check_output(job.path, job.tracing.overwrite)
    return False


def _check_checkpoints(job: Job, checkpoints: Checkpoints) -> None:
    """See to it that a fresh start destroys no work unasked."""
    if job.tracing.resume or not checkpoints.existing():
        return
    if not job.tracing.overwrite:
        raise InputError(
            f"{job.path}: an interrupted run has left a checkpoint; --resume goes on from it, --overwrite starts afresh"
        )
    checkpoints.remove()


def _trace_and_save(job: Job, checkpoints: Checkpoints, note: Note) -> xr.Dataset:
    tracing = job.tracing
    try:
        with chosen_executor(tracing.cluster, tracing.workers, note) as executor, shown_progress() as watch:
            product = run(
                job.plan.spec,
                executor.workers,
                watch,
                executor.map_batches,
                prepare=executor.prepare,
                batches=job.plan.batches if job.share else None,
                checkpoints=checkpoints,
                note=note,
            )
        save_product(product, job.path, tracing.overwrite)
    except KeyboardInterrupt:
        note("interrupted", "", batches_kept=checkpoints.kept_batches)
        raise Interrupted(
            f"interrupted; {job.path} was not written. {_how_to_go_on(job, checkpoints)}"
        ) from None
    except TracerError as error:
        note("failed", "", reason=str(error))
        if checkpoints.begun and checkpoints.write() and checkpoints.kept:
            raise type(error)(f"{error}. {_how_to_go_on(job, checkpoints)}") from None
        raise
    checkpoints.remove()
    note("written", "", product=job.path, data_checksum=product.attrs["data_checksum"])
    return product


def _how_to_go_on(job: Job, checkpoints: Checkpoints) -> str:
    if not checkpoints.kept:
        return "No batch is kept. Run the same command to start again"
    batches = checkpoints.kept_batches
    kept = f"{batches} batches are kept" if batches else "A part of the first batch is kept"
    return f"{kept}; go on with: {job.again}"


def _say_how_it_stopped(product: xr.Dataset) -> None:
    reached = product.attrs.get("stop_reached")
    if reached is not None:
        error = product.attrs.get("stop_relative_error")
        known = "" if error is None else f", the region's mean known to {100 * error:.3g} %"
        word = "reached" if reached else "NOT reached"
        typer.echo(f"relative error asked for: {word} after {product.attrs['batches']} batches{known}")
