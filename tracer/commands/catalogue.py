"""`tracer catalogue`: the built-in bodies, gases and lines."""

import difflib
from collections.abc import Callable, Mapping, Sequence
from enum import StrEnum
from typing import Annotated, Any, NamedTuple

import typer

from tracer.catalogue.lines import lines
from tracer.catalogue.load import bodies, gases, source_notes
from tracer.catalogue.photo_rates import photo_rates
from tracer.commands.arguments import JSON, argument
from tracer.commands.catalogue_figures import body_figures, gas_figures, line_figures
from tracer.commands.catalogue_tables import print_bases, print_bodies, print_gases, print_lines
from tracer.commands.machine_output import print_json
from tracer.commands.tables import print_wrapped_rows
from tracer.errors import InputError
from tracer.units import quoted


class Part(StrEnum):
    """A part of the catalogue, as the user names it."""

    BODIES = "bodies"
    GASES = "gases"
    LINES = "lines"


class Contents(NamedTuple):
    """How a part is printed for people and for machines, and the data files it comes from."""

    show: Callable[[], None]
    figures: Callable[[], Sequence[Mapping[str, Any]]]
    files: tuple[str, ...]


CONTENTS: Mapping[Part, Contents] = {
    Part.BODIES: Contents(
        lambda: print_bodies(tuple(bodies().values())),
        lambda: [body_figures(body) for body in bodies().values()],
        ("bodies.csv", "hosts.csv"),
    ),
    Part.GASES: Contents(
        lambda: print_gases(tuple(gases().values()), photo_rates()),
        lambda: [gas_figures(gas, photo_rates().get(gas.name)) for gas in gases().values()],
        ("gases.csv", "photo_rates_1au.csv", "photo_channels_1au.csv"),
    ),
    Part.LINES: Contents(
        lambda: print_lines(tuple(lines().values())),
        lambda: [line_figures(line) for line in lines().values()],
        ("lines.csv", "solar_residual_flux.csv", "g_values_1au.csv"),
    ),
}


def command(
    part: Annotated[
        str | None,
        argument("bodies|gases|lines", "What to list; all three, in short, by default."),
    ] = None,
    json: JSON = False,
) -> None:
    """List the built-in bodies, gases and lines: values, units, sources, and how well they are known."""
    parts: tuple[Part, ...] = tuple(Part) if part is None else (_part(part),)
    if json:
        print_json(
            {str(one): {"entries": CONTENTS[one].figures(), "sources": _sources(one)} for one in parts}
        )
        return
    for one in parts:
        typer.echo(f"{one}")
        CONTENTS[one].show()
        typer.echo()
    if part is None:
        typer.echo(
            "Sources, ranges and how well each value is known: tracer catalogue bodies, gases or lines"
        )
        return
    if parts == (Part.GASES,):
        print_bases(photo_rates())
    typer.echo("sources, as the heads of the data files state them")
    for file, text in _sources(parts[0]).items():
        typer.echo(f"  {file}")
        print_wrapped_rows([("", text)])


def _part(word: str) -> Part:
    close = difflib.get_close_matches(word.casefold(), list(Part), n=1)
    if word not in list(Part):
        hint = f"did you mean {close[0]}?" if close else f"must be one of {', '.join(Part)}"
        raise InputError(f"{quoted(word)} is no part of the catalogue; {hint}")
    return Part(word)


def _sources(part: Part) -> dict[str, str]:
    return {file: " ".join(source_notes(file).split()) for file in CONTENTS[part].files}
