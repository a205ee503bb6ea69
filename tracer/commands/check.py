"""`tracer check`: the resolved scene, without running it."""

from pathlib import Path
from types import MappingProxyType
from typing import Any

import typer

from tracer.commands.arguments import JSON, RUN_FILE, SETTINGS
from tracer.commands.durations import duration
from tracer.commands.machine_output import print_json
from tracer.commands.next_command import name_next
from tracer.commands.tables import print_rows
from tracer.constants import ASTRONOMICAL_UNIT
from tracer.engine.preview import HostPreview, Preview, ReleasePreview, SunPreview, preview
from tracer.engine.runspec.load import load_run
from tracer.engine.runspec.run import RunSpec
from tracer.engine.scene import build_scene
from tracer.engine.surface_preview import SurfacePreview
from tracer.engine.tracing import available_processors

HOUR = 3600.0
DAY = 86400.0
EMPHASIS = MappingProxyType(
    {
        "even": "even: launches as often as they happen",
        "far": "far: half of the launches even, half to those that a pilot finds to reach far or escape; bounces as "
        "they happen",
    }
)
MEGABYTE = 1e6
NEAR_PHASE = 15.0
"""Degrees up to which a moon is near a phase that has a name."""

_INSIDE = ("sun", "host", "surface")


def command(
    run_file: RUN_FILE,
    settings: SETTINGS = None,
    json: JSON = False,
) -> None:
    """Validate a run file and print what it means, without running it."""
    spec = load_run(run_file, settings or ())
    figures = preview(spec, build_scene(spec), available_processors())
    if json:
        print_json({"file": Path(run_file).name, "title": spec.title, **_flat(figures)})
        return
    _print_scene(spec, figures)
    for release in figures.releases:
        _print_release(release)
    for note in figures.notes:
        typer.echo(f"Note: {note}.")
    name_next("run", run_file, settings=settings)


def _flat(figures: Preview) -> dict[str, Any]:
    """Return the figures with those of Sun and ground beside the others; null where there is no Sun."""
    sun: dict[str, Any] = dict.fromkeys(SunPreview._fields)
    if figures.sun is not None:
        sun = figures.sun._asdict()
    return {
        **{key: value for key, value in figures._asdict().items() if key not in _INSIDE},
        **sun,
        **(dict.fromkeys(HostPreview._fields) if figures.host is None else figures.host._asdict()),
        **figures.surface._asdict(),
    }


def _print_scene(spec: RunSpec, figures: Preview) -> None:
    rotation = figures.rotation_period
    typer.echo(f"{spec.title}\n{figures.species} over {figures.body}")
    print_rows(
        [
            ("propagator", figures.propagator),
            *_sun_rows(figures.sun),
            *_host_rows(figures.host),
            ("radius", f"{figures.radius / 1e3:.6g} km"),
            ("gm", f"{figures.gm / 1e9:.7g} km3 s-2"),
            ("surface gravity", f"{figures.surface_gravity:.4g} m s-2"),
            ("escape speed", f"{figures.escape_speed:.5g} m s-1"),
            (
                "rotation period",
                "the ground does not turn" if rotation is None else f"{rotation / DAY:.6g} d sidereal",
            ),
            *_surface_rows(figures.surface),
            ("outer radius", _outer_radius(figures)),
            ("age limit", f"{figures.age_limit / DAY:.6g} d"),
            ("constant losses in flight", f"{figures.loss_rate:.4g} s-1" if figures.loss_rate else "none"),
            *_residence_rows(figures),
            ("particles", _particles(spec, figures)),
            ("emphasis", EMPHASIS[figures.emphasis]),
            ("launch-speed bins", _speed_bins(figures)),
            ("memory", f"about {figures.memory / MEGABYTE:.0f} MB"),
            ("product", f"at most {figures.product_size / MEGABYTE:.0f} MB on disk"),
        ]
    )


def _sun_rows(sun: SunPreview | None) -> list[tuple[str, str]]:
    if sun is None:
        return [("sunlight", "none: gravity alone")]
    ratio = sun.radiation_acceleration_over_gravity
    share = "" if ratio is None else f", {100 * ratio:.3g} % of surface gravity"
    life = "no photo-loss" if sun.photo_lifetime is None else f"{sun.photo_lifetime:.4g} s in full sunlight"
    anomaly = "" if sun.true_anomaly is None else f"{sun.true_anomaly:.6g} deg"
    return [
        *([("epoch", sun.epoch)] if sun.epoch is not None else []),
        ("true anomaly", anomaly or "not given: the distance is"),
        ("distance from the Sun", f"{sun.distance / ASTRONOMICAL_UNIT:.6g} au"),
        ("radial velocity", f"{sun.radial_velocity / 1e3:.5g} km/s, positive away from the Sun"),
        ("motion", _motion(sun)),
        ("radiation acceleration", f"{sun.radiation_acceleration:.4g} m s-2 on an atom at rest{share}"),
        ("photo-lifetime", life),
        ("lines with g", ", ".join(sun.lines) or "none"),
        ("lines without g", ", ".join(sun.lines_without_g) or "none"),
    ]


def _motion(sun: SunPreview) -> str:
    if sun.event_window is None:
        return "stationary: distance and velocity of the body stay the same"
    return f"moving: fluxes count in the last {sun.event_window / HOUR:.4g} h before the stated position"


def _host_rows(host: HostPreview | None) -> list[tuple[str, str]]:
    if host is None:
        return []
    off = f", {abs(host.host_latitude):.3g} deg {'north' if host.host_latitude > 0.0 else 'south'}"
    rows = [
        ("host", f"{host.host}, {host.host_gm / 1e9:.7g} km3 s-2, radius {host.host_radius / 1e3:.6g} km"),
        ("distance from the host", f"{host.host_distance / 1e3:.7g} km"),
        ("period about the host", f"{host.host_period / DAY:.6g} d sidereal"),
        (
            "phase angle",
            f"{host.phase_angle:.5g} deg from the Sun towards dusk{off if host.host_latitude else ''}; "
            f"{_phase(host.phase_angle)} seen from the host",
        ),
    ]
    if host.transverse_velocity is not None:
        rows.append(("transverse velocity", f"{host.transverse_velocity / 1e3:.5g} km/s about the Sun"))
    if host.eclipse is not None and host.sun_past_host is not None:
        part = f"{100.0 * host.sun_past_host:.3g} % of the Sun seen past the host from the centre"
        rows.append(("eclipse by the host", f"{host.eclipse}; {part}"))
    return rows


def _phase(angle: float) -> str:
    """Return the moon's phase by the host's `angle` [deg] from the Sun."""
    words = ("full moon", "last quarter", "new moon", "first quarter")
    nearest, before = round(angle / 90.0), int(angle // 90.0)
    off = abs(angle - 90.0 * nearest)
    if off >= NEAR_PHASE:
        return f"between {words[before % 4]} and {words[(before + 1) % 4]}"
    return ("" if off < 1.0 else "near ") + words[nearest % 4]


def _residence_rows(figures: Preview) -> list[tuple[str, str]]:
    rows = [
        (
            f"residence at {one.place}",
            f"{_long_time(one.residence_time)} at {one.temperature:.5g} K",
        )
        for one in figures.residence
    ]
    if figures.photon_desorption_rate is not None:
        rows.append(("photon desorption", f"{figures.photon_desorption_rate:.4g} s-1 under the Sun overhead"))
    return rows


def _long_time(seconds: float) -> str:
    """Return a time in seconds, and in what people think in where it is long."""
    return f"{seconds:.4g} s" + (f" ({duration(seconds)})" if seconds >= HOUR else "")


def _surface_rows(surface: SurfacePreview) -> list[tuple[str, str]]:
    day = surface.solar_day
    rows = [] if day is None else [("mean solar day", f"{day / DAY:.6g} d")]
    kelvin = "not given, and nothing needs it"
    if surface.temperature_law is not None:
        kelvin = (
            f"{surface.temperature_law}: {surface.noon_temperature:.5g} K at noon and "
            f"{surface.midnight_temperature:.5g} K at midnight on the equator, "
            f"{surface.lowest_temperature:.5g} to {surface.highest_temperature:.5g} K anywhere"
        )
    sticking = f"{surface.lowest_sticking:.4g}"
    if surface.highest_sticking != surface.lowest_sticking:
        sticking += f" on the warmest to {surface.highest_sticking:.4g} on the coldest ground"
    return [*rows, ("surface temperature", kelvin), ("sticking", sticking)]


def _particles(spec: RunSpec, figures: Preview) -> str:
    limit = "" if spec.ensemble.stop is None else "at most "
    return f"{limit}{figures.particles:,} in {limit}{figures.batches} batches, seed {figures.seed}"


def _speed_bins(figures: Preview) -> str:
    if figures.fastest_bin is None:
        return "none: other laws of speed need other runs"
    return (
        f"{figures.speed_bins} up to {figures.fastest_bin / 1e3:.4g} km/s, one edge at the escape speed; "
        "as many launches again serve them"
    )


def _outer_radius(figures: Preview) -> str:
    origin = ", the Hill radius" if figures.outer_radius_is_hill_radius else ""
    if origin and figures.host is not None:
        origin += " about the host"
    return f"{figures.outer_radius / 1e3:.6g} km, {figures.outer_radius / figures.radius:.4g} radii{origin}"


def _print_release(release: ReleasePreview) -> None:
    typer.echo(f"\nrelease {release.name!r}, {release.rate:.4g} s-1")
    rows = [
        ("temperature", _figure(release.temperature, "K")),
        ("most probable speed", _figure(release.most_probable_speed, "m s-1")),
        ("mean speed", _figure(release.mean_speed, "m s-1")),
        ("rms speed", _figure(release.rms_speed, "m s-1")),
        ("mean launch speed", _figure(release.launch_speed, "m s-1")),
        ("jeans parameter", _figure(release.jeans_parameter, "")),
        ("scale height", _figure(release.scale_height, "km", 1e3)),
        ("median hop time, gravity alone", _figure(release.hop_time, "s")),
        ("median hop range, gravity alone", _figure(release.hop_range, "km", 1e3)),
        ("cross the outer radius", f"{100 * release.crossing_fraction:.3g} % of first flights"),
        ("rarest launches told apart", _rarest(release.rarest_launch)),
    ]
    print_rows([(name, text) for name, text in rows if text])


def _rarest(share: float | None) -> str:
    if share is None:
        return ""
    return "none: speed decides nothing" if share == 1.0 else f"the fastest {share:.2g} of all"


def _figure(value: float | None, unit: str, size: float = 1.0) -> str:
    return "" if value is None else f"{value / size:.5g} {unit}".rstrip()
