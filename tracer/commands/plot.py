"""`tracer plot`: a figure of a product."""

import math

import typer

from tracer.commands.arguments import OVERWRITE
from tracer.commands.input_guard import refuse_inputs
from tracer.commands.next_command import name_next
from tracer.commands.output_file import FIGURE_ENDINGS, check_output_file
from tracer.commands.plot_options import (
    DPI,
    DRAWINGS,
    FATE,
    IMAGE,
    LEVEL,
    LINE,
    OF_IMAGES,
    OUTPUT,
    PLACE,
    PRODUCT,
    RELEASE,
    SKY,
    WHAT,
    WIDTH,
    WidthName,
)
from tracer.errors import InputError
from tracer.plots.figures import FIGURES, SWEPT_FIGURES, Choice, What
from tracer.plots.plan_table import read_plan
from tracer.plots.saving import DOTS_PER_INCH, figure_bytes
from tracer.plots.swept.brightness import SkyPlace
from tracer.plots.swept.column import Place
from tracer.plots.timeline import timeline
from tracer.product.layout import LAUNCH_SPEED, REPLICATES
from tracer.product.lock import output_lock
from tracer.product.reading import is_sweep, load_all, open_product, open_sweep
from tracer.product.writing import save_bytes
from tracer.units import quoted

OF_VELOCITY = ("column_", "brightness_", "mean_velocity_", "velocity_width_", "line_shift_", "line_width_")
"""Beginnings of the variables that the figure of velocities needs."""


def command(
    product: PRODUCT,
    what: WHAT,
    output: OUTPUT,
    image_name: IMAGE = None,
    line: LINE = None,
    release: RELEASE = None,
    fate: FATE = None,
    place: PLACE = None,
    sky: SKY = None,
    level: LEVEL = None,
    width: WIDTH = WidthName.FULL,
    dpi: DPI = DOTS_PER_INCH,
    overwrite: OVERWRITE = False,
) -> None:
    """Draw one figure of a product, or of a plan, ready for a paper, as PNG, PDF or SVG."""
    for option, value, goes, words in (
        ("--image", image_name, _of_image(what), OF_IMAGES),
        ("--line", line, _of_image(what), OF_IMAGES),
        ("--release", release, what is not What.PLAN, "figures of a product"),
        ("--fate", fate, what is What.SWEPT_LEDGER, What.SWEPT_LEDGER),
        ("--place", place, what is What.SWEPT_COLUMN, What.SWEPT_COLUMN),
        ("--sky", sky, what is What.SWEPT_BRIGHTNESS, What.SWEPT_BRIGHTNESS),
        ("--level", level, what is What.SWEPT_TAIL, What.SWEPT_TAIL),
    ):
        if value is not None and not goes:
            raise InputError(f"{option}: goes with --what {words}, not with --what {what}")
    refuse_inputs(output, [product])
    ending = check_output_file("--output", output, FIGURE_ENDINGS, overwrite, "figure")
    choice = Choice(
        release,
        image_name,
        line,
        "column" if width is WidthName.COLUMN else "full",
        fate,
        None if place is None else Place(*_two_numbers("--place", place, "0,12")),
        None if sky is None else SkyPlace(*_two_numbers("--sky", sky, "-5,0")),
        _positive("--level", level),
    )
    with output_lock(output):
        if what is What.PLAN:
            content = figure_bytes(timeline(read_plan(product), choice.width), ending, dpi)
        elif what in SWEPT_FIGURES:
            content = _of_sweep(product, what, choice, ending, dpi)
        else:
            content = _of_product(product, what, choice, ending, dpi)
        save_bytes(content, output, overwrite)
    typer.echo(output)
    if what in SWEPT_FIGURES:
        name_next("sweep", product, "--point", "1", "-o", "point-1.nc")
    elif what is What.PLAN:
        name_next("report", "PRODUCT.nc", product, "-o", "report.html")
    else:
        name_next("report", product, "-o", "report.html")


def _of_image(what: What) -> bool:
    return what in DRAWINGS and DRAWINGS[what].of_image


def _two_numbers(option: str, text: str, example: str) -> tuple[float, float]:
    try:
        first, second = (float(part) for part in text.split(","))
    except ValueError:
        first = second = math.nan
    if not (math.isfinite(first) and math.isfinite(second)):
        raise InputError(f"{option}: {quoted(text)} is not two numbers; write for example {example}")
    return first, second


def _positive(option: str, value: float | None) -> float | None:
    if value is not None and not (math.isfinite(value) and value > 0.0):
        raise InputError(f"{option}: {value:g} is out of range; must be above 0")
    return value


def _of_sweep(product: str, what: What, choice: Choice, ending: str, dpi: int) -> bytes:
    """Return a figure of a sweep's product, of which no more than a point at a time is read."""
    with open_sweep(product) as ds:
        try:
            return figure_bytes(SWEPT_FIGURES[what].draw(ds, choice), ending, dpi)
        except InputError as error:
            raise InputError(f"{product}: {error}") from None
        except (OSError, RuntimeError) as error:
            raise InputError(f"{product}: is damaged: its data cannot be read ({error})") from None


def _of_product(product: str, what: What, choice: Choice, ending: str, dpi: int) -> bytes:
    if is_sweep(product):
        words = ", ".join(SWEPT_FIGURES)
        raise InputError(
            f"--what: {what} is a figure of a run, and {product} is a sweep's, which has {words}"
        )
    with open_product(product) as stored:
        spared = [name for name in map(str, stored.data_vars) if _is_spared(name, what)]
        # No figure shows responses, the largest part of a product that has them.
        ds = stored.drop_vars(spared).drop_dims(LAUNCH_SPEED, errors="ignore")
        load_all(ds, product)
        try:
            return figure_bytes(FIGURES[what].draw(ds, choice), ending, dpi)
        except InputError as error:
            raise InputError(f"{product}: {error}") from None


def _is_spared(name: str, what: What) -> bool:
    """Return whether a variable needs not be read: replicates, most of a product, where no use is made of them."""
    if not name.endswith(REPLICATES):
        return False
    if what is What.TAIL:
        return not name.startswith(("column_", "brightness_"))
    if what is What.VELOCITY:
        return not name.startswith(OF_VELOCITY)
    return what not in (What.DENSITY, What.PROFILE) or name != "number_density" + REPLICATES
