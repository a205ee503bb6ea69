"""What a field takes, read from its annotation: for messages and for the reference."""

from collections.abc import Iterator
from typing import Any, Literal, get_args, get_origin

from pydantic.fields import FieldInfo

from tracer.inputs.table import Table
from tracer.units import quoted


def tables_in(annotation: Any) -> tuple[type[Table], ...]:
    """Return the tables that a value of this annotation may be; several are the laws of one field."""
    if isinstance(annotation, type) and issubclass(annotation, Table):
        return (annotation,)
    return tuple(table for part in get_args(annotation) for table in tables_in(part))


def dimensions_in(table: type[Table]) -> set[str]:
    """Return the names in `DIMENSIONS` of all that this table and those inside it measure."""
    parts = (part for field in table.model_fields.values() for part in (field.annotation, *field.metadata))
    return {name for part in parts for name in _dimensions(part)}


def law_name(table: type[Table]) -> str:
    """Return the name by which `law` tells this table."""
    return str(table.model_fields["law"].default)


def is_list_of_tables(annotation: Any) -> bool:
    """Whether the field is written with double brackets, `[[...]]`."""
    return get_origin(annotation) is tuple and bool(tables_in(annotation))


def kind(field: FieldInfo) -> str:
    """Return what a field takes, in words."""
    return _kind(field.annotation, tuple(field.metadata))


def example(field: FieldInfo) -> str:
    """Return a value that the field takes, as the file shows it; empty where the kind says enough."""
    return next((str(item.example()) for item in field.metadata if hasattr(item, "example")), "")


def _kind(annotation: Any, metadata: tuple[Any, ...] = ()) -> str:
    own_words = [item.kind() for item in metadata if hasattr(item, "kind")]
    if own_words:
        return str(own_words[0])
    if hasattr(annotation, "__metadata__"):
        return _kind(annotation.__origin__, annotation.__metadata__)
    if annotation is bool:
        return "true or false"
    arguments = get_args(annotation)
    if get_origin(annotation) is Literal:
        return " or ".join(quoted(word) for word in arguments)
    if get_origin(annotation) is tuple and not is_list_of_tables(annotation):
        length = "" if arguments[-1] is Ellipsis else f" of {len(arguments)}"
        return f"list{length}, each a {_kind(arguments[0])}"
    tables = tables_in(annotation)
    if is_list_of_tables(annotation):
        return "list of tables"
    if len(tables) > 1:
        return "law, one of " + ", ".join(quoted(law_name(table)) for table in tables)
    if tables:
        return "table"
    return _kind(next(part for part in arguments if part is not type(None)))


def _dimensions(part: Any) -> Iterator[str]:
    if hasattr(part, "dimensions"):
        yield from part.dimensions
    elif hasattr(part, "dimension"):
        yield part.dimension
    elif isinstance(part, type) and issubclass(part, Table):
        yield from dimensions_in(part)
    for inner in get_args(part):
        yield from _dimensions(inner)
