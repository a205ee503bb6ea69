"""`tracer retention`: which gases a body keeps."""

from collections.abc import Sequence
from math import sqrt
from pathlib import Path
from typing import Annotated, Any

import typer

from tracer.catalogue.load import bodies, gases
from tracer.catalogue.records import Gas
from tracer.commands.arguments import JSON, argument, option
from tracer.commands.choices import unknown_name
from tracer.commands.durations import AGE_IN_GYR
from tracer.commands.machine_output import print_json
from tracer.commands.output_file import FIGURE_ENDINGS, check_output_file
from tracer.commands.quantity_options import Measure, si_option
from tracer.commands.retention_bodies import (
    Circumstances,
    Subject,
    catalogue_subjects,
    check_overrides,
    subject,
)
from tracer.commands.retention_report import BodyReport, Wind, body_report
from tracer.commands.retention_text import print_legend, print_report
from tracer.constants import SOLAR_SYSTEM_AGE
from tracer.errors import InputError
from tracer.inputs.interval import Interval
from tracer.physics.retention import SIX_TIMES, kept_jeans_parameter
from tracer.physics.thermal import escape_speed, most_probable_speed, rms_speed
from tracer.plots.retention_field import BodyPoint, GasLimit, retention_field
from tracer.plots.saving import figure_bytes
from tracer.product.writing import save_bytes

DEFAULT_GASES = ("H", "H2", "He", "O", "H2O", "Ne", "Na", "Ar", "K", "CO2")
DRAWN_GASES = ("H", "H2", "He", "O", "Na", "Ar")
"""Gases of the figure unless others are asked for: few enough for their bands to stay apart."""

LIMITS_OF = "Moon"
"""The body whose radius over escape speed enters the figure's limits; others shift them by less than 1 %."""

# Ends so wide that no body is refused, and so narrow that no figure overflows.
TEMPERATURE = Measure("temperature", "K", Interval(at_least=1e-3, at_most=1e6))
DISTANCE = Measure("length", "au", Interval(at_least=0.01, at_most=1e5))
RADIUS = Measure("length", "km", Interval(at_least=1e-3, at_most=1e6))
GM = Measure("gravitational parameter", "km3 s-2", Interval(at_least=1e-18, at_most=1e9))
FIELD = Measure("magnetic field", "nT", Interval(at_least=-1e9, at_most=1e9))
WIND_DENSITY = Measure("number density", "cm-3", Interval(at_least=1e-6, at_most=1e9))
WIND_SPEED = Measure("speed", "km/s", Interval(at_least=1e-3, at_most=1e5))


def _quantity(words: str) -> Any:
    return option("QUANTITY", words)


def command(
    names: Annotated[
        list[str] | None,
        argument(
            "BODY",
            "Bodies of the catalogue (tracer catalogue bodies), or one of your own with --radius and --gm.",
        ),
    ] = None,
    gas: Annotated[
        list[str] | None,
        option(
            "GAS...",
            "Gases of the catalogue (tracer catalogue gases), one or more. "
            f"By default {', '.join(DEFAULT_GASES)}.",
        ),
    ] = None,
    temperature: Annotated[
        str | None,
        _quantity(
            'Temperature of the ground, as "390 K". By default the subsolar equilibrium at the distance.'
        ),
    ] = None,
    distance: Annotated[
        str | None,
        _quantity('Distance from the Sun, as "0.31 au". By default the semi-major axis of the orbit.'),
    ] = None,
    field: Annotated[
        str | None,
        _quantity('Magnetic field at the equator, as "195 nT". By default the catalogue\'s.'),
    ] = None,
    wind_density: Annotated[
        str | None,
        _quantity('Protons in the solar wind, as "50 cm-3"; with --wind-speed gives the stand-off.'),
    ] = None,
    wind_speed: Annotated[str | None, _quantity('Speed of the solar wind, as "400 km/s".')] = None,
    radius: Annotated[str | None, _quantity('Radius of a body of your own, as "1800 km".')] = None,
    gm: Annotated[
        str | None,
        _quantity('Gravitational constant times mass of a body of your own, as "9500 km3 s-2".'),
    ] = None,
    plot: Annotated[
        str | None,
        option(
            "FILE", "Draw escape speed against temperature with the limits of each gas (.png, .pdf or .svg)."
        ),
    ] = None,
    overwrite: Annotated[bool, typer.Option("--overwrite", help="Replace an existing figure.")] = False,
    json: JSON = False,
) -> None:
    """Say which gases a body keeps, and what takes the others.

    By gas: three speeds, six-times rule, jeans parameter, flux and lifetime,
    lifetime in sunlight. By body: temperature used, escape speed, stand-off.

    For example: tracer retention Moon Mercury --gas Na K --plot retention.png
    """
    given = Circumstances(
        radius=si_option("--radius", radius, RADIUS),
        gm=si_option("--gm", gm, GM),
        temperature=si_option("--temperature", temperature, TEMPERATURE),
        distance=si_option("--distance", distance, DISTANCE),
        field=si_option("--field", field, FIELD),
    )
    wind = _wind(
        si_option("--wind-density", wind_density, WIND_DENSITY),
        si_option("--wind-speed", wind_speed, WIND_SPEED),
    )
    body_names, gas_names = _sorted_words(names or [], gas or [])
    if plot is not None:
        check_output_file("--plot", plot, FIGURE_ENDINGS, overwrite, "figure")
    check_overrides(body_names, given)
    asked = [subject(name, given) for name in body_names]
    chosen = [_gas(name) for name in gas_names or DEFAULT_GASES]
    reports = [body_report(one, chosen, wind) for one in asked]
    _print(reports, wind, json)
    if plot is not None:
        drawn = chosen if gas_names else [_gas(name) for name in DRAWN_GASES]
        save_bytes(figure_bytes(_figure(asked, drawn), Path(plot).suffix.lower()), plot, overwrite)
        typer.echo(f"figure: {plot}", err=json)
    if not json:
        typer.echo("Next: tracer new", err=True)


def _sorted_words(names: Sequence[str], gas: Sequence[str]) -> tuple[list[str], list[str]]:
    """Return (bodies, gases), each once: `--gas Na K` gives K as a further word, and `--gas Na,K` is one word."""
    gas_names = [part for word in gas for part in word.split(",")]
    if gas_names:
        # No body of the catalogue bears the name of a gas.
        gas_names += [name for name in names if name in gases()]
        names = [name for name in names if name not in gases()]
    if not names:
        raise InputError(f"BODY: missing; name one or more of {', '.join(bodies())}")
    return list(dict.fromkeys(names)), list(dict.fromkeys(gas_names))


def _gas(name: str) -> Gas:
    if name not in gases():
        raise unknown_name("--gas", name, gases())
    return gases()[name]


def _wind(density: float | None, speed: float | None) -> Wind | None:
    if density is None and speed is None:
        return None
    if density is None:
        raise InputError(
            '--wind-density: missing beside --wind-speed; give for example --wind-density "50 cm-3"'
        )
    if speed is None:
        raise InputError(
            '--wind-speed: missing beside --wind-density; give for example --wind-speed "400 km/s"'
        )
    return Wind(density, speed)


def _print(reports: Sequence[BodyReport], wind: Wind | None, json: bool) -> None:
    if json:
        figures = {"solar_system_age": SOLAR_SYSTEM_AGE, "wind": wind, "bodies": list(reports)}
        print_json(figures)
        return
    for report in reports:
        print_report(report, wind)
    print_legend()


def _figure(asked: Sequence[Subject], chosen: Sequence[Gas]) -> Any:
    names = {one.name for one in asked}
    others = [one for one in catalogue_subjects() if one.name not in names]
    points = [
        BodyPoint(one.name, one.temperature, escape_speed(one.gm, one.radius), one.name in names)
        for one in (*asked, *others)
    ]
    standard = bodies()[LIMITS_OF]
    jeans = kept_jeans_parameter(standard.gm, standard.radius)
    ratio = sqrt(jeans) if jeans else 0.0
    limits = [
        GasLimit(gas.name, ratio * most_probable_speed(1.0, gas.mass), SIX_TIMES * rms_speed(1.0, gas.mass))
        for gas in chosen
    ]
    words = (
        f"escape speed = {ratio:.3g} most probable speeds:\ne-folding time of thermal escape {AGE_IN_GYR} Gyr"
    )
    return retention_field(points, limits, words)
