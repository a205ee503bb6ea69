"""The reference in runs/README.md is what the package makes."""

import re
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any, get_args

from pydantic.fields import FieldInfo

from tracer.engine.runspec.reference import BEGIN, END, reference
from tracer.engine.runspec.run import RunSpec
from tracer.inputs.kinds import tables_in
from tracer.inputs.quantity import Measured
from tracer.inputs.table import Table, fields_of
from tracer.units import DIMENSIONS

README = Path(__file__).parents[4] / "runs" / "README.md"


def _tables(table: type[Table]) -> Iterator[type[Table]]:
    yield table
    for field in table.model_fields.values():
        for inner in tables_in(field.annotation):
            yield from _tables(inner)


def _measured(fields: Mapping[str, FieldInfo]) -> Iterator[Measured]:
    parts: list[Any] = [part for field in fields.values() for part in (field.annotation, *field.metadata)]
    while parts:
        part = parts.pop()
        parts.extend(get_args(part))
        if isinstance(part, Measured):
            yield part


def test_readme_holds_the_present_reference() -> None:
    text = README.read_text(encoding="utf-8")
    assert text.count(BEGIN) == text.count(END) == 1
    written = text[text.index(BEGIN) + len(BEGIN) + 1 : text.index(END)]
    assert written == reference(), "rewrite what stands between the markers with reference()"


def test_examples_are_shown_of_the_quantities_in_use_and_of_no_others() -> None:
    examples = re.search(r"### Quantities\n\n(.*?)\n\n", reference(), re.DOTALL)
    assert examples
    shown = re.findall(r'^\| ([a-z ]+) \| `"', examples[1], re.MULTILINE)
    used = {
        DIMENSIONS[item.dimension].word
        for table in _tables(RunSpec)
        for item in _measured(table.model_fields)
    }
    assert len(shown) == len(set(shown))
    assert set(shown) == used


def test_every_key_is_explained() -> None:
    text = reference()
    for table in _tables(RunSpec):
        assert table.__doc__
        for key, field in fields_of(table).items():
            if key != "law":
                assert field.description, f"{table.__name__}.{key}"
                assert f"`{key}`" in text or f"{key}]" in text
