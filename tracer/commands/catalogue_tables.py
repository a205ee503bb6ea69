"""The catalogue's entries as tables of at most 100 columns."""

from collections.abc import Mapping, Sequence

import typer

from tracer.catalogue.light_records import Line, PhotoRate
from tracer.catalogue.records import Body, Gas
from tracer.commands.catalogue_figures import g_origin, velocity_span
from tracer.commands.tables import print_table, print_wrapped_rows
from tracer.constants import ASTRONOMICAL_UNIT, ATOMIC_MASS

DAY = 86400.0
UNKNOWN = "-"


def print_bodies(entries: Sequence[Body]) -> None:
    """Print the bodies' constants."""
    heads = (
        "body",
        "host",
        "GM\nkm3 s-2",
        "radius\nkm",
        "rotation\nd sidereal",
        "semi-major\naxis",
        "eccen-\ntricity",
        "Bond\nalbedo",
        "emis-\nsivity",
        "field\nnT",
    )
    rows = [
        (
            body.name,
            body.host.name,
            f"{body.gm / 1e9:.8g}",
            f"{body.radius / 1e3:.6g}",
            f"{body.rotation_period / DAY:.8g}",
            _axis(body),
            f"{body.orbit.eccentricity:g}",
            f"{body.bond_albedo:g}",
            f"{body.emissivity:g}",
            f"{body.equatorial_field * 1e9:.4g}",
        )
        for body in entries
    ]
    print_table(heads, rows, (0, 1))
    print_wrapped_rows(
        [("orbit:", "about the host; field: magnetic, at the equator's surface, 0 where the body has none")]
    )


def print_gases(entries: Sequence[Gas], rates: Mapping[str, PhotoRate]) -> None:
    """Print the gases' masses and rates of photo-loss."""
    heads = (
        "gas",
        "\ndescription",
        "mass\nu",
        "quiet\nSun",
        "active\nSun",
        "plausible\nfrom",
        "\nto",
        "ionising,\nquiet",
    )
    rows = [
        (gas.name, gas.description, f"{gas.mass / ATOMIC_MASS:.8g}", *_rates(rates.get(gas.name)))
        for gas in entries
    ]
    print_table(heads, rows, (0, 1))
    print_wrapped_rows(
        [
            (
                "rates:",
                "photo-ionisation of atoms, photo-ionisation and photo-dissociation of molecules, s-1 at 1 au in full "
                "sunlight; they fall as the inverse square of the distance. Ionising: the part that leaves an ion",
            )
        ]
    )


def print_bases(rates: Mapping[str, PhotoRate]) -> None:
    """Print how each photo-rate is known."""
    typer.echo("how the photo-rates are known")
    print_wrapped_rows([(species, rate.basis) for species, rate in rates.items()])
    typer.echo()


def print_lines(entries: Sequence[Line]) -> None:
    """Print the lines and what is known of their g."""
    heads = (
        "line",
        "gas",
        "wavelength\nvacuum nm",
        "oscillator\nstrength f",
        "g in continuum\nat 1 au s-1",
        "g known from",
        "between km/s,\n+ receding",
    )
    rows = [
        (
            line.name,
            line.species,
            f"{line.wavelength * 1e9:.5f}",
            f"{line.oscillator_strength:g}",
            UNKNOWN if line.continuum_g is None else f"{line.continuum_g:g}",
            g_origin(line) or "not known",
            _span(line),
        )
        for line in entries
    ]
    print_table(heads, rows, (0, 1, 5))
    print_wrapped_rows(
        [
            (
                "g:",
                "photons that an atom in the line's lower level scatters per second at 1 au. A line whose g is not "
                "known neither pushes nor shines, unless the run file gives it: [[gas.line]]",
            )
        ]
    )


def _axis(body: Body) -> str:
    # A moon's orbit is about its host, and read in km.
    axis = body.orbit.semi_major_axis
    return f"{axis / ASTRONOMICAL_UNIT:.6g} au" if body.host.orbit is None else f"{axis / 1e3:.7g} km"


def _rates(rate: PhotoRate | None) -> tuple[str, ...]:
    if rate is None:
        return (UNKNOWN,) * 5
    ionizing = UNKNOWN if rate.ionizing_quiet is None else f"{rate.ionizing_quiet:.1e}"
    return (f"{rate.quiet:.1e}", f"{rate.active:.1e}", f"{rate.low:.1e}", f"{rate.high:.1e}", ionizing)


def _span(line: Line) -> str:
    span = velocity_span(line)
    return UNKNOWN if span is None else f"{span[0] / 1e3:+.1f} to {span[1] / 1e3:+.1f}"
