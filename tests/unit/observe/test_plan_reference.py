"""The plan reference in runs/README.md is what the package makes."""

from collections.abc import Iterator
from pathlib import Path

from tracer.inputs.kinds import tables_in
from tracer.inputs.table import Table
from tracer.observe.planspec.plan import BEGIN, END, PlanSpec, plan_reference

README = Path(__file__).parents[3] / "runs" / "README.md"


def tables(table: type[Table]) -> Iterator[type[Table]]:
    yield table
    for field in table.model_fields.values():
        for inner in tables_in(field.annotation):
            yield from tables(inner)


def test_readme_holds_the_present_plan_reference():
    text = README.read_text(encoding="utf-8")
    assert text.count(BEGIN) == text.count(END) == 1
    written = text[text.index(BEGIN) + len(BEGIN) + 1 : text.index(END)]
    assert written == plan_reference(), "rewrite what stands between the markers with plan_reference()"


def test_every_key_is_explained():
    text = plan_reference()
    for table in tables(PlanSpec):
        assert table.__doc__
        for key, field in table.model_fields.items():
            if key != "law":
                assert field.description, f"{table.__name__}.{key}"
                assert f"`{key}`" in text or f"{key}]" in text or f"Laws of `{key}`" in text
