"""The retention report as text of at most 100 columns."""

from math import pi, sqrt

import typer

from tracer.commands.durations import AGE_IN_GYR, duration
from tracer.commands.retention_report import BodyReport, Wind
from tracer.commands.tables import print_table, print_wrapped_rows
from tracer.constants import ASTRONOMICAL_UNIT
from tracer.physics.magnetopause import CURVED_BOUNDARY, FLAT_SHEET
from tracer.physics.retention import GasRetention

HEADS = (
    "gas",
    "most\nprobable\nm/s",
    "\nmean\nm/s",
    "\nrms\nm/s",
    "6 rms /\nescape\nspeed",
    "six-\ntimes\nrule",
    "\njeans\nparameter",
    "jeans\nflux / n\nm/s",
    "\njeans\nlifetime",
    f"against\n{AGE_IN_GYR}\nGyr",
    "\nphoto-\nlifetime",
)
WORD_COLUMNS = (0, 5, 9)

LEGEND = (
    (
        "most probable, mean, rms",
        "sqrt(2kT/m), sqrt(8kT/(pi m)), sqrt(3kT/m): three speeds of the same gas at the temperature above",
    ),
    ("6 rms / escape speed", "six rms speeds over the escape speed of the body"),
    (
        "six-times rule",
        "leaks: six rms speeds exceed the escape speed, and the gas leaks away over the age of the Solar System; "
        "stays: they don't. Common practice; exact for the most probable speed and cautious for the rms speed, so a "
        f"gas that leaks may still have a jeans lifetime longer than {AGE_IN_GYR} Gyr",
    ),
    (
        "jeans parameter",
        "(escape speed / most probable speed) squared, radius over scale height; ! below 3, where the gas flows out",
    ),
    (
        "jeans flux / n",
        "atoms that escape per area and second over their number density n at the ground: "
        "v_p/(2 sqrt(pi)) (1 + lambda) exp(-lambda)",
    ),
    ("jeans lifetime", "scale height over jeans flux / n: e-folding time by thermal escape alone"),
    (f"against {AGE_IN_GYR} Gyr", "whether that is shorter or longer than the age of the Solar System"),
    (
        "photo-lifetime",
        "in full sunlight of the quiet Sun at the distance above, a dash where no rate or no distance is known; its "
        "range is in tracer catalogue gases and in --json",
    ),
)


def print_report(report: BodyReport, wind: Wind | None) -> None:
    """Print one body: what it is, then a line for each gas."""
    typer.echo(report.name)
    print_wrapped_rows(
        [
            ("radius, gm", f"{report.radius / 1e3:.6g} km, {report.gm / 1e9:.8g} km3 s-2"),
            ("distance from the Sun", _distance(report)),
            ("temperature", f"{report.temperature:.4g} K, {report.temperature_origin}"),
            ("escape speed", f"{report.escape_speed:.5g} m/s"),
            (f"kept for {AGE_IN_GYR} Gyr", _kept(report)),
            ("magnetic stand-off", _standoff(report, wind)),
        ]
    )
    typer.echo()
    print_table(HEADS, [_row(gas) for gas in report.gases], WORD_COLUMNS)
    for note in report.notes:
        print_wrapped_rows([("Note:", note + ".")])
    typer.echo()


def print_legend() -> None:
    """Print what each column means."""
    print_wrapped_rows(LEGEND)


def _distance(report: BodyReport) -> str:
    if report.distance is None:
        return "not given; --distance gives the photo-lifetimes"
    return f"{report.distance / ASTRONOMICAL_UNIT:.6g} au, {report.distance_origin}"


def _kept(report: BodyReport) -> str:
    jeans = report.kept_jeans_parameter
    if jeans is None:
        return "every gas that does not flow out"
    return (
        f"a gas of jeans parameter above {jeans:.2f}: escape speed over {sqrt(jeans):.2f} most probable speeds, "
        f"{sqrt(jeans * pi / 4.0):.2f} mean speeds or {sqrt(jeans / 1.5):.2f} rms speeds"
    )


def _standoff(report: BodyReport, wind: Wind | None) -> str:
    field = report.equatorial_field
    if field is None:
        return "unknown; --field, --wind-density and --wind-speed give it"
    if field == 0.0:
        plasma = "" if report.host is None else f", or the plasma of {report.host} inside its magnetosphere"
        return f"none: without a magnetic field the body meets the wind directly{plasma}"
    known = f"field {field * 1e9:.4g} nT at the equator"
    flat, curved = report.standoff_flat_sheet, report.standoff_curved_boundary
    if wind is None or flat is None or curved is None:
        return f"{known}; --wind-density and --wind-speed give the stand-off"
    stream = f"wind {wind.density / 1e6:.4g} cm-3 of protons at {wind.speed / 1e3:.4g} km/s"
    return (
        f"{flat:.2f} radii from the centre for a flat sheet (f {FLAT_SHEET:g}), {curved:.2f} for the curved "
        f"boundary (f {CURVED_BOUNDARY:g}); {known}, {stream}{_directly(flat, curved)}"
    )


def _directly(flat: float, curved: float) -> str:
    if curved < 1.0:
        return ". Under one radius: the body meets the wind directly"
    if flat < 1.0:
        return ". The flat sheet's is under one radius: the body meets the wind directly, or just escapes it"
    return ""


def _row(gas: GasRetention) -> tuple[str, ...]:
    return (
        gas.species,
        f"{gas.most_probable_speed:.0f}",
        f"{gas.mean_speed:.0f}",
        f"{gas.rms_speed:.0f}",
        f"{gas.six_rms_over_escape:.3g}",
        "leaks" if gas.leaks_by_six_times_rule else "stays",
        f"{'! ' if gas.hydrodynamic_outflow else ''}{gas.jeans_parameter:.4g}",
        f"{gas.jeans_flux_per_density:.3g}",
        duration(gas.jeans_lifetime),
        "longer" if gas.outlives_solar_system else "shorter",
        "-" if gas.photo_lifetime is None else duration(gas.photo_lifetime),
    )
