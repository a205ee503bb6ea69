"""`tracer sweep`: one run file, traced again and again with other values of some of its keys."""

from collections.abc import Mapping
from pathlib import Path
from typing import Annotated, NamedTuple

import typer

from tracer.commands.arguments import CLUSTER, JSON, LOG, SETTINGS, WORKERS, Tracing, argument, option
from tracer.commands.budget_table import print_budget
from tracer.commands.event_log import event_log
from tracer.commands.input_guard import about, refuse_inputs
from tracer.commands.machine_output import print_json
from tracer.commands.next_command import name_next, resuming_command
from tracer.commands.progress import shown_progress
from tracer.commands.sweep_tables import print_point_budgets, print_prepared
from tracer.engine.executors.choice import chosen_executor
from tracer.engine.progress import Note
from tracer.engine.scene import referenced_files
from tracer.engine.sweep.points import Point, Sweep, load_sweep, sweep_points
from tracer.engine.sweep.preparing import PreparedSweep, notes_of, prepare_sweep
from tracer.engine.sweep.tracing import Kept, SweepInterrupted, SweepStopped, run_sweep
from tracer.engine.tracing import available_processors, run
from tracer.errors import InputError, Interrupted
from tracer.product.lock import output_lock
from tracer.product.reading import is_sweep, open_sweep
from tracer.product.sweeping import sweep_point
from tracer.product.writing import check_output, save_product

ENDING = ".nc"


class Job(NamedTuple):
    """What was asked for, put together from the options."""

    sweep: Sweep
    path: str
    tracing: Tracing
    again: str
    """The command that goes on after an interruption."""


def command(
    sweep_file: Annotated[
        str,
        argument(
            "SWEEP.toml",
            "The sweep file: a run file with a table \\[sweep], see runs/README.md. With --point also the product "
            "of a sweep.",
        ),
    ],
    output: Annotated[
        str | None,
        option(
            "OUT.nc",
            "The product; by default the sweep file's name with .nc, in the current folder.",
            "--output",
            "-o",
        ),
    ] = None,
    check: Annotated[
        bool,
        typer.Option(
            "--check", help="Validate all points and print them, with memory and size; trace nothing."
        ),
    ] = False,
    point: Annotated[
        int | None,
        typer.Option(
            min=1,
            metavar="N",
            help="One point alone, counted as --check prints them, as the product of a run: traced from a sweep file, "
            "taken out of a sweep's product.",
            show_default=False,
        ),
    ] = None,
    workers: WORKERS = None,
    overwrite: Annotated[
        bool,
        typer.Option(
            "--overwrite", help="Replace an existing product; drop what an interrupted sweep has left."
        ),
    ] = False,
    resume: Annotated[
        bool,
        typer.Option(
            "--resume", help="Go on from the finished points and checkpoints of an interrupted sweep."
        ),
    ] = False,
    cluster: CLUSTER = None,
    log: LOG = None,
    settings: SETTINGS = None,
    json: JSON = False,
) -> None:
    """Trace a run file over lists or ranges of its values and write one product with the swept dimensions."""
    tracing = Tracing(workers, cluster, log, settings or (), overwrite, resume)
    if json and not check:
        raise InputError("--json: goes with --check")
    about_all = _first_given({"--check": check, "--resume": resume})
    if point is not None and about_all is not None:
        raise InputError(f"--point: cannot go with {about_all}, which is about all points of a sweep")
    if Path(sweep_file).suffix == ENDING or is_sweep(sweep_file):
        _take_out(sweep_file, _point_of_product(sweep_file, point, tracing), output, overwrite)
        return
    sweep = load_sweep(sweep_file, tracing.settings)
    if check:
        _check(prepare_sweep(sweep, workers or available_processors()), sweep_file, settings, json)
        return
    path = _default_output(sweep_file, point) if output is None else output
    for name in (path, log):
        if name is not None:
            refuse_inputs(name, _inputs(sweep))
    job = Job(sweep, path, tracing, resuming_command("sweep", sweep_file, "-o", path, tracing=tracing))
    with event_log(log) as note:
        if point is None:
            _sweep(job, note)
        else:
            _trace_one(point, job, note)


def _point_of_product(product: str, point: int | None, tracing: Tracing) -> int:
    """Return the point to take out of a sweep's product, for which options of tracing are of no use."""
    if point is None:
        raise InputError(f"{product}: is a product, not a sweep file; --point N takes one point out of it")
    of_tracing = _first_given(
        {
            "--set": tracing.settings,
            "--workers": tracing.workers,
            "--cluster": tracing.cluster,
            "--log": tracing.log,
        }
    )
    if of_tracing is not None:
        raise InputError(
            f"{product}: is a product, which is traced already; {of_tracing} goes with a sweep file"
        )
    return point


def _first_given(options: Mapping[str, object]) -> str | None:
    return next((name for name, value in options.items() if value), None)


def _default_output(sweep_file: str, point: int | None) -> str:
    return Path(sweep_file).stem + ("" if point is None else f"-point-{point}") + ENDING


def _inputs(sweep: Sweep) -> list[str | Path]:
    """Return the files that a sweep reads, as far as its first point tells."""
    first = next(sweep_points(sweep))
    return [sweep.file, sweep.run_file, *referenced_files(first.spec)]


def _sweep(job: Job, note: Note) -> None:
    try:
        with (
            chosen_executor(job.tracing.cluster, job.tracing.workers, note) as executor,
            shown_progress() as watch,
        ):
            made = run_sweep(
                job.sweep,
                job.path,
                executor.workers,
                watch,
                executor.map_batches,
                prepare=executor.prepare,
                overwrite=job.tracing.overwrite,
                resume=job.tracing.resume,
                note=note,
            )
    except SweepInterrupted as interruption:
        note("interrupted", "", points_kept=interruption.kept.points)
        raise Interrupted(
            f"interrupted; {job.path} was not written. {_how_to_go_on(job, interruption.kept)}"
        ) from None
    except SweepStopped as error:
        note("failed", "", reason=str(error))
        told = SweepStopped(f"{error}. {_how_to_go_on(job, error.kept)}", error.kept, error.exit_code)
        raise told from None
    if not made:
        typer.echo(f"product: {job.path} is complete already: nothing to do")
        name_next("summary", job.path)
        return
    with open_sweep(job.path) as ds:
        print_point_budgets(ds)
        attributes = ds.attrs
        note("written", "", product=job.path, data_checksum=attributes["data_checksum"])
        typer.echo(
            f"{attributes['points']} points, {attributes['flights']:,} flights in {attributes['wall_seconds']:.1f} s "
            f"on {attributes['workers']} workers"
        )
    typer.echo(f"product: {job.path}")
    name_next("plot", job.path, "--what", "swept-ledger", "-o", "swept-ledger.png")


def _how_to_go_on(job: Job, kept: Kept) -> str:
    safe = [f"{kept.points} {'point' if kept.points == 1 else 'points'}"] if kept.points else []
    safe += (
        [f"{kept.batches} {'batch' if kept.batches == 1 else 'batches'} of point {kept.number}"]
        if kept.batches
        else []
    )
    if not safe:
        return "No point is kept. Run the same command with --resume to start again"
    return f"{' and '.join(safe)} kept; go on with: {job.again}"


def _trace_one(number: int, job: Job, note: Note) -> None:
    """Trace one point alone, as `tracer run` would trace its run file."""
    chosen = _point(job.sweep, number)
    check_output(job.path, job.tracing.overwrite)
    with (
        output_lock(job.path),
        chosen_executor(job.tracing.cluster, job.tracing.workers, note) as executor,
        shown_progress() as watch,
    ):
        product = run(
            chosen.spec,
            executor.workers,
            watch,
            executor.map_batches,
            prepare=executor.prepare,
            note=note,
        )
        save_product(product, job.path, job.tracing.overwrite)
    typer.echo(f"point {number}: {chosen.words}")
    print_budget(product)
    typer.echo(f"product: {job.path}")
    name_next("summary", job.path)


def _point(sweep: Sweep, number: int) -> Point:
    if number > len(sweep):
        raise InputError(f"--point: there is no point {number}; there are {len(sweep)}, counted from 1")
    return next(point for point in sweep_points(sweep) if point.number == number)


def _take_out(product: str, number: int, output: str | None, overwrite: bool) -> None:
    """Write one point of a sweep's product as the product of a run."""
    path = _default_output(product, number) if output is None else output
    refuse_inputs(path, [product])
    check_output(path, overwrite)
    with output_lock(path), open_sweep(product) as ds:
        with about(product):
            one = sweep_point(ds, number)
        save_product(one, path, overwrite)
        print_budget(one)
    typer.echo(f"product: {path}")
    name_next("summary", path)


def _check(prepared: PreparedSweep, sweep_file: str, settings: list[str] | None, json: bool) -> None:
    if json:
        points = [
            {
                "point": one.point.number,
                "settings": one.point.settings,
                "particles": one.atoms,
                **one.sizes._asdict(),
            }
            for one in prepared.points
        ]
        print_json(
            {
                "file": Path(sweep_file).name,
                "title": prepared.sweep.title,
                "points": points,
                "particles": sum(one.atoms for one in prepared.points),
                "memory": prepared.memory,
                "product_size": prepared.product_size,
                "notes": list(notes_of(prepared)),
            }
        )
        return
    print_prepared(prepared)
    for note in notes_of(prepared):
        typer.echo(f"Note: {note}.")
    name_next("sweep", sweep_file, settings=settings)
