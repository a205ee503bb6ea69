"""The run-file reference, made from the tables themselves so that it cannot drift."""

from collections.abc import Iterator, Sequence
from typing import Any

from pydantic.fields import FieldInfo

from tracer.engine.runspec.kinds import is_list_of_tables, kind, law_name, tables_in
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.sky import SkyPoint
from tracer.engine.runspec.table import Table
from tracer.units import DIMENSIONS, quoted

BEGIN = "<!-- reference: made from the package, do not edit -->"
END = "<!-- end of reference -->"

_PREFACE = """\
## Run-file reference

A run file is TOML in UTF-8. Every quantity with a dimension is a text with its unit, such as `"1200
K"`; units are written as `astropy.units` reads them, and where `radii` is allowed it means the
radius of the body. Local times are plain numbers of hours in [0, 24): noon 12, dusk 18, midnight 0,
dawn 6. Paths are relative to the run file. A law is a table with the key `law`; a law whose other
keys all have defaults may be given by its name alone. Keys that stand in no table below are
refused. From the command line, `--set release[1].rate="2e24 s-1"` changes a key before the file is
checked; lists count from 1.
"""


def reference() -> str:
    """Return the reference as Markdown: a table for each section of the run file, one for each law."""
    sections = [_PREFACE, _section("Top level", RunSpec, _top_level(RunSpec))]
    for key, field in RunSpec.model_fields.items():
        sections.extend(_sections(key, field))
    sections.append(_units())
    return "\n".join(sections)


def _top_level(table: type[Table]) -> dict[str, FieldInfo]:
    return {key: field for key, field in table.model_fields.items() if not tables_in(field.annotation)}


def _sections(path: str, field: FieldInfo) -> Iterator[str]:
    """Yield the sections of one field and of the tables inside it."""
    tables = [table for table in tables_in(field.annotation) if table is not SkyPoint]
    if len(tables) > 1:
        yield _laws(path, tables)
        return
    for table in tables:
        heading = f"`[[{path}]]`" if is_list_of_tables(field.annotation) else f"`[{path}]`"
        yield _section(heading, table, table.model_fields)
        for key, inner in table.model_fields.items():
            yield from _sections(f"{path}.{key}", inner)


def _section(heading: str, table: type[Table], fields: dict[str, FieldInfo]) -> str:
    explanation = "" if table is RunSpec else f"{_first_line(table)}\n\n"
    rows = [_row(key, field) for key, field in fields.items()]
    return f"### {heading}\n\n{explanation}" + _markdown(("key", "kind", "default", "meaning"), rows)


def _laws(path: str, tables: list[type[Table]]) -> str:
    rows: list[tuple[str, ...]] = []
    for table in tables:
        rows.append((f"`{law_name(table)}`", "", "", "", _first_line(table)))
        keys = {key: field for key, field in table.model_fields.items() if key != "law"}
        rows.extend(("", *_row(key, field)) for key, field in keys.items())
    return f"### Laws of `{path}`\n\n" + _markdown(("law", "key", "kind", "default", "meaning"), rows)


def _row(key: str, field: FieldInfo) -> tuple[str, str, str, str]:
    return f"`{key}`", _kind_words(field), _default(field), field.description or ""


def _kind_words(field: FieldInfo) -> str:
    words = kind(field)
    return "law, see below" if words.startswith("law") else words


def _default(field: FieldInfo) -> str:
    default: Any = field.default
    if field.is_required():
        return "required"
    if default is None:
        return ""
    if default == ():
        return "none"
    if isinstance(default, Table):
        return f"`{default.model_dump()['law']}`" if "law" in type(default).model_fields else "as below"
    return f"`{quoted(default if isinstance(default, int | float) else str(default))}`"


def _units() -> str:
    dimensions = [dimension for dimension in DIMENSIONS.values() if not dimension.radii_allowed]
    rows = [(dimension.word, f'`"{dimension.example}"`') for dimension in dimensions]
    return "### Quantities\n\n" + _markdown(("quantity of", "for example"), rows)


def _markdown(head: tuple[str, ...], rows: Sequence[tuple[str, ...]]) -> str:
    lines = [head, ("---",) * len(head), *rows]
    return "".join(f"| {' | '.join(cell.replace('|', chr(92) + '|') for cell in line)} |\n" for line in lines)


def _first_line(table: type[Table]) -> str:
    return (table.__doc__ or "").split("\n\n")[0]
