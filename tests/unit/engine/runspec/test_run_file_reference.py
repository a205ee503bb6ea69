"""The reference in runs/README.md is what the package makes."""

from collections.abc import Iterator
from pathlib import Path

from tracer.engine.runspec.kinds import tables_in
from tracer.engine.runspec.reference import BEGIN, END, reference
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.table import Table

README = Path(__file__).parents[4] / "runs" / "README.md"


def _tables(table: type[Table]) -> Iterator[type[Table]]:
    yield table
    for field in table.model_fields.values():
        for inner in tables_in(field.annotation):
            yield from _tables(inner)


def test_readme_holds_the_present_reference() -> None:
    text = README.read_text(encoding="utf-8")
    assert text.count(BEGIN) == text.count(END) == 1
    written = text[text.index(BEGIN) + len(BEGIN) + 1 : text.index(END)]
    assert written == reference(), "rewrite what stands between the markers with reference()"


def test_every_key_is_explained() -> None:
    text = reference()
    for table in _tables(RunSpec):
        assert table.__doc__
        for key, field in table.model_fields.items():
            if key != "law":
                assert field.description, f"{table.__name__}.{key}"
                assert f"`{key}`" in text or f"{key}]" in text
