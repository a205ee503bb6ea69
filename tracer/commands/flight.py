"""`tracer flight`: one flight from launch to end."""

import csv
from io import StringIO
from typing import Annotated

import typer

from tracer.commands.arguments import JSON, OVERWRITE, RUN_FILE, SETTINGS, option
from tracer.commands.input_guard import refuse_inputs
from tracer.commands.machine_output import print_json
from tracer.commands.next_command import name_next
from tracer.commands.tables import print_rows
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene, referenced_files
from tracer.engine.single_flight import PATH_COLUMNS, Flight, Launch, fly
from tracer.errors import InputError
from tracer.product.writing import check_output, save_bytes
from tracer.units import parse, si


def command(
    run_file: RUN_FILE,
    latitude: Annotated[
        float, typer.Option(help="Latitude of the launch, -90 to 90, in degrees.", show_default=False)
    ],
    local_time: Annotated[
        float,
        typer.Option(
            help="Local time of the launch, in hours, 0 to below 24; 12 is noon.", show_default=False
        ),
    ],
    speed: Annotated[
        str,
        typer.Option(help='Launch speed in the Sun-fixed frame, for example "2 km/s".', show_default=False),
    ],
    zenith_angle: Annotated[
        float, typer.Option(help="Angle from the local vertical, 0 to 90, in degrees.", show_default=False)
    ],
    azimuth: Annotated[
        float,
        typer.Option(
            help="Direction along the ground, from north through east, in degrees.", show_default=False
        ),
    ],
    output: Annotated[
        str | None,
        option("FLIGHT.csv", "Write the path as CSV.", "--output", "-o"),
    ] = None,
    overwrite: OVERWRITE = False,
    settings: SETTINGS = None,
    json: JSON = False,
) -> None:
    """Follow one flight from a stated launch to landing, outer radius or age limit.

    The launch speed counts in the Sun-fixed frame: the ground's own motion is not added to it. A body that moves is at
    its stated position at the launch.
    """
    launch = _launch(latitude, local_time, speed, zenith_angle, azimuth)
    spec = load_run(run_file, settings or ())
    scene = build_scene(spec)
    if output is not None:
        refuse_inputs(output, [run_file, *referenced_files(spec)])
        check_output(output, overwrite)
    flown = fly(scene, launch)
    if output is not None:
        save_bytes(_path_text(flown).encode(), output, overwrite)
    if json:
        print_json(flown.summary._asdict())
        return
    summary = flown.summary
    print_rows(
        [
            ("fate", summary.fate),
            ("flight_time", f"{summary.flight_time:.9g} s"),
            ("apex_altitude", f"{summary.apex_altitude / 1e3:.9g} km"),
            ("latitude", f"{summary.latitude:.7g} deg"),
            ("local_time", f"{summary.local_time:.7g} h"),
            ("ground_arc", f"{summary.ground_arc:.8g} deg"),
        ]
    )
    name_next("run", run_file, settings=settings)


def _launch(latitude: float, local_time: float, speed: str, zenith_angle: float, azimuth: float) -> Launch:
    _check("--latitude", latitude, -90.0 <= latitude <= 90.0, "-90 to 90 deg")
    _check("--local-time", local_time, 0.0 <= local_time < 24.0, "0 to below 24 h")
    _check("--zenith-angle", zenith_angle, 0.0 <= zenith_angle <= 90.0, "0 to 90 deg")
    _check("--azimuth", azimuth, -360.0 <= azimuth <= 360.0, "-360 to 360 deg")
    try:
        metres_per_second = si(parse(speed, "speed"))
    except ValueError as error:
        raise InputError(f"--speed: {error}") from None
    _check("--speed", speed, metres_per_second > 0.0, "above 0")
    return Launch(latitude, local_time, metres_per_second, zenith_angle, azimuth)


def _check(option: str, value: object, allowed: bool, range_words: str) -> None:
    if not allowed:
        raise InputError(f"{option}: {value} is out of range; must be {range_words}")


def _path_text(flown: Flight) -> str:
    text = StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(PATH_COLUMNS)
    writer.writerows(flown.path.tolist())
    return text.getvalue()
