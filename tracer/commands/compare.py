"""`tracer compare`: what a measured profile says about the sources of products."""

from collections.abc import Sequence
from contextlib import ExitStack
from pathlib import Path
from typing import Annotated, Any

import typer
import xarray as xr

from tracer.commands.arguments import OVERWRITE, argument, option
from tracer.commands.comparison_text import print_comparison
from tracer.commands.input_guard import refuse_inputs
from tracer.commands.machine_output import json_text, print_json
from tracer.commands.next_command import name_next
from tracer.commands.output_file import FIGURE_ENDINGS, check_output_file
from tracer.errors import InputError
from tracer.observe.fit.comparison import CAUTION, compared, needed_of
from tracer.observe.fit.profile import Profile, read_profile
from tracer.observe.fit.result import Comparison
from tracer.observe.observationspec.observation import ObservationSpec, load_observation
from tracer.plots.comparison import comparison
from tracer.plots.saving import figure_bytes
from tracer.product.layout import LINE
from tracer.product.lock import output_lock
from tracer.product.reading import load_all, open_product
from tracer.product.writing import save_bytes

RESULT = ".json"


def command(
    files: Annotated[
        list[str],
        argument(
            "PRODUCT.nc... OBSERVATION.toml",
            "One product of `tracer run`, or several whose releases are pooled; then the observation file, whose "
            "keys stand in runs/README.md.",
        ),
    ],
    output: Annotated[
        list[str] | None,
        option(
            "OUT",
            f"May be repeated; the ending says what is written: {RESULT} the result with all points, "
            f"{', '.join(FIGURE_ENDINGS)} the figure of data, model, parts and residuals.",
            "--output",
            "-o",
        ),
    ] = None,
    json: Annotated[
        bool,
        typer.Option(
            "--json",
            help="Print the figures for machines: parameters of laws in SI units, rates in s-1, background and points "
            "in the profile's units, which `points` names.",
        ),
    ] = False,
    overwrite: OVERWRITE = False,
) -> None:
    """Say what a measured profile tells of the sources of a product's gas: rates, law parameters, how sure.

    The product's image goes through the same slit and seeing as the profile.
    Rates are fitted by weighted least squares, none below 0; parameters of
    launch-speed laws by profile likelihood, from a product made with
    ensemble.speed_bins. Ranges hold 68 and 95 %: where law parameters are
    fitted that is measured on profiles drawn about the best fit.

    An absolute rate hangs on g-values, photo-lifetimes and the profile's
    calibration as well, which the ranges do not count.
    """
    products, observation = _told_apart(files)
    spec = load_observation(observation)
    outputs = list(output or ())
    read = [*products, observation, str(spec.folder / spec.profile.file)]
    for path in outputs:
        refuse_inputs(path, read)
        check_output_file("--output", path, (RESULT, *FIGURE_ENDINGS), overwrite)
    with ExitStack() as stack:
        for path in outputs:
            stack.enter_context(output_lock(path))
        found = _compared(products, spec)
        for path in outputs:
            save_bytes(_content(path, found), path, overwrite)
    if json:
        print_json(figures_of(found))
    else:
        print_comparison(found)
        for path in outputs:
            typer.echo(path)
        typer.echo(CAUTION, err=True)
    if any(Path(path).suffix.lower() in FIGURE_ENDINGS for path in outputs):
        name_next("report", products[0], "-o", "report.html")
    else:
        name_next("compare", *files, "-o", f"{Path(observation).stem}.png")


def figures_of(found: Comparison) -> dict[str, Any]:
    """Return a comparison as the figures of `--json` and of the result file."""
    points = found.points
    return {
        "title": found.title,
        "products": list(found.products),
        "what": found.what,
        "view": found.view,
        "rates": found.rates,
        "held_rates": found.held_rates,
        "parameters": found.parameters,
        "background": found.background,
        "chi_square": found.chi_square,
        "degrees_of_freedom": found.degrees_of_freedom,
        "probability": found.probability,
        "minus_two_log_likelihood": found.minus_two_log_likelihood,
        "range_ends": {
            "calibrated": found.range_ends.draws > 0,
            "draws": found.range_ends.draws,
            "seed": found.range_ends.seed,
            "rises": {name: list(rises) for name, rises in found.range_ends.rises.items()},
        },
        "residuals": points.residual.tolist(),
        "correlations": {
            "names": list(found.correlations.names),
            "matrix": found.correlations.matrix.tolist(),
        },
        "statements": list(found.statements),
        "warnings": list(found.warnings),
        "points": {
            "position_unit": points.position_unit,
            "unit": points.unit,
            "position": points.position.tolist(),
            "value": points.value.tolist(),
            "sigma": points.sigma.tolist(),
            "upper_limit": points.upper.tolist(),
            "model": points.model.tolist(),
            "model_standard_error": points.model_error.tolist(),
            "parts": {name: part.tolist() for name, part in points.parts.items()},
            "background": points.background.tolist(),
        },
        "caution": CAUTION,
    }


def _told_apart(files: Sequence[str]) -> tuple[list[str], str]:
    if len(files) < 2:
        raise InputError(f"{files[0]}: alone is too little; compare needs PRODUCT.nc OBSERVATION.toml")
    products, observation = list(files[:-1]), files[-1]
    wrong = next((name for name in products if Path(name).suffix.lower() == ".toml"), None)
    if wrong is not None:
        raise InputError(f"{wrong}: is no product; the products come first, the observation file last")
    if len({Path(name).resolve() for name in products}) < len(products):
        raise InputError(f"{products[0]}: a product is named twice; each counts once")
    return products, observation


def _compared(products: Sequence[str], spec: ObservationSpec) -> Comparison:
    loaded, profile = [], read_profile(spec)
    for product in products:
        with open_product(product) as stored:
            names = _needed(stored, product, spec, profile)
            ds = stored[names]
            lines = [str(name) for name in ds["line_name"].values] if LINE in ds.dims else []
            if spec.profile.line in lines:
                # Responses of the other lines would take as much memory again.
                ds = ds.isel({LINE: [lines.index(spec.profile.line)]})
            load_all(ds, product)
            loaded.append((product, ds))
    return compared(loaded, spec)


def _needed(stored: xr.Dataset, product: str, spec: ObservationSpec, profile: Profile) -> list[str]:
    try:
        return needed_of(stored, spec, profile)
    except InputError as error:
        text = str(error)
        raise InputError(text if text.startswith(spec.file) else f"{product}: {text}") from None


def _content(path: str, found: Comparison) -> bytes:
    ending = Path(path).suffix.lower()
    if ending == RESULT:
        return json_text(figures_of(found)).encode()
    return figure_bytes(comparison(found), ending)
