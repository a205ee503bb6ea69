"""The references in runs/README.md are what the package makes, and explain every key."""

import re
from collections.abc import Callable, Iterator, Mapping
from pathlib import Path
from typing import Any, NamedTuple, get_args

import pytest
from pydantic.fields import FieldInfo

from tracer.engine.runspec import reference as run
from tracer.engine.runspec.run import RunSpec
from tracer.engine.sweep import table as sweep
from tracer.inputs.kinds import tables_in
from tracer.inputs.quantity import Measured
from tracer.inputs.table import Table, fields_of
from tracer.observe.observationspec import observation
from tracer.observe.planspec import plan
from tracer.units import DIMENSIONS

README = Path(__file__).parents[2] / "runs" / "README.md"


class Reference(NamedTuple):
    """A reference, the marks between which it stands, what makes it, and the table that it explains.

    `headed` are keys whose values are headings of their own.
    """

    begin: str
    end: str
    made: Callable[[], str]
    root: type[Table]
    headed: tuple[str, ...] = ()


REFERENCES = {
    "run file": Reference(run.BEGIN, run.END, run.reference, RunSpec, ("law",)),
    "sweep": Reference(sweep.BEGIN, sweep.END, sweep.sweep_reference, sweep.SweepTable),
    "plan": Reference(plan.BEGIN, plan.END, plan.plan_reference, plan.PlanSpec, ("law",)),
    "observation": Reference(
        observation.BEGIN, observation.END, observation.observation_reference, observation.ObservationSpec
    ),
}


def tables(table: type[Table]) -> Iterator[type[Table]]:
    yield table
    for field in table.model_fields.values():
        for inner in tables_in(field.annotation):
            yield from tables(inner)


def measured(fields: Mapping[str, FieldInfo]) -> Iterator[Measured]:
    parts: list[Any] = [part for field in fields.values() for part in (field.annotation, *field.metadata)]
    while parts:
        part = parts.pop()
        parts.extend(get_args(part))
        if isinstance(part, Measured):
            yield part


@pytest.mark.parametrize("what", REFERENCES)
def test_readme_holds_the_present_reference(what: str) -> None:
    one = REFERENCES[what]
    text = README.read_text(encoding="utf-8")
    assert text.count(one.begin) == text.count(one.end) == 1
    written = text[text.index(one.begin) + len(one.begin) + 1 : text.index(one.end)]
    assert written == one.made(), f"rewrite what stands between the markers with {one.made.__name__}()"


@pytest.mark.parametrize("what", REFERENCES)
def test_every_key_is_explained(what: str) -> None:
    text = REFERENCES[what].made()
    for table in tables(REFERENCES[what].root):
        assert table.__doc__
        for key, field in fields_of(table).items():
            if key not in REFERENCES[what].headed:
                assert field.description, f"{table.__name__}.{key}"
                assert f"`{key}`" in text or f"{key}]" in text


def test_sweep_explains_its_axes() -> None:
    assert sweep.AxisTable in tables(sweep.SweepTable)


def test_examples_are_shown_of_the_quantities_in_use_and_of_no_others() -> None:
    examples = re.search(r"### Quantities\n\n(.*?)\n\n", run.reference(), re.DOTALL)
    assert examples
    shown = re.findall(r'^\| ([a-z ]+) \| `"', examples[1], re.MULTILINE)
    used = {
        DIMENSIONS[item.dimension].word for table in tables(RunSpec) for item in measured(table.model_fields)
    }
    assert len(shown) == len(set(shown))
    assert set(shown) == used
