"""The reference of an input file, made from its tables themselves so that it cannot drift."""

from collections.abc import Iterator, Sequence
from typing import Any

from pydantic.fields import FieldInfo

from tracer.inputs.kinds import dimensions_in, is_list_of_tables, kind, law_name, tables_in
from tracer.inputs.table import Table, fields_of
from tracer.units import DIMENSIONS, quoted


def reference_of(root: type[Table], preface: str, hidden: tuple[type[Table], ...] = ()) -> str:
    """Return the reference as Markdown: a table for each section of the file, one for each law.

    Parameters
    ----------
    root : type[Table]
        What the file as a whole may hold.
    preface : str
        Heading and rules, above the sections.
    hidden : tuple of type[Table]
        Tables that are told by the words of the fields that take them.
    """
    sections = [preface]
    if dimensions_in(root):
        sections.append(_units(root))
    if top := _top_level(root):
        sections.append(_section("Top level", None, top))
    for key, field in fields_of(root).items():
        sections.extend(_sections(key, field, hidden))
    return "\n".join(sections)


def _top_level(table: type[Table]) -> dict[str, FieldInfo]:
    return {key: field for key, field in fields_of(table).items() if not tables_in(field.annotation)}


def _sections(path: str, field: FieldInfo, hidden: tuple[type[Table], ...]) -> Iterator[str]:
    """Yield the sections of one field and of the tables inside it."""
    tables = [table for table in tables_in(field.annotation) if table not in hidden]
    if len(tables) > 1:
        yield _laws(path, tables)
        return
    for table in tables:
        heading = f"`[[{path}]]`" if is_list_of_tables(field.annotation) else f"`[{path}]`"
        yield _section(heading, table, fields_of(table))
        for key, inner in fields_of(table).items():
            yield from _sections(f"{path}.{key}", inner, hidden)


def _section(heading: str, table: type[Table] | None, fields: dict[str, FieldInfo]) -> str:
    explanation = "" if table is None else f"{_first_line(table)}\n\n"
    rows = [_row(key, field) for key, field in fields.items()]
    return f"### {heading}\n\n{explanation}" + _markdown(("key", "kind", "default", "meaning"), rows)


def _laws(path: str, tables: list[type[Table]]) -> str:
    rows: list[tuple[str, ...]] = []
    for table in tables:
        rows.append((f"`{law_name(table)}`", "", "", "", _first_line(table)))
        keys = {key: field for key, field in fields_of(table).items() if key != "law"}
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
    if isinstance(default, tuple):
        return f"`{list(default)}`"
    return f"`{quoted(default if isinstance(default, int | float) else str(default))}`"


def _units(root: type[Table]) -> str:
    used = {DIMENSIONS[name].word for name in dimensions_in(root)}
    shown = [entry for entry in DIMENSIONS.values() if entry.word in used and not entry.radii_allowed]
    rows = [(dimension.word, f'`"{dimension.example}"`') for dimension in shown]
    return "### Quantities\n\n" + _markdown(("quantity of", "for example"), rows)


def _markdown(head: tuple[str, ...], rows: Sequence[tuple[str, ...]]) -> str:
    lines = [head, ("---",) * len(head), *rows]
    return "".join(f"| {' | '.join(cell.replace('|', chr(92) + '|') for cell in line)} |\n" for line in lines)


def _first_line(table: type[Table]) -> str:
    return (table.__doc__ or "").split("\n\n")[0]
