"""The sweep reference in runs/README.md is what the package makes."""

from pathlib import Path

from tracer.engine.sweep.table import BEGIN, END, AxisTable, SweepTable, sweep_reference

README = Path(__file__).parents[4] / "runs" / "README.md"


def test_readme_holds_the_present_sweep_reference():
    text = README.read_text(encoding="utf-8")
    assert text.count(BEGIN) == text.count(END) == 1
    written = text[text.index(BEGIN) + len(BEGIN) + 1 : text.index(END)]
    assert written == sweep_reference(), "rewrite what stands between the markers with sweep_reference()"


def test_every_key_is_explained():
    text = sweep_reference()
    for table in (SweepTable, AxisTable):
        assert table.__doc__
        for key, field in table.model_fields.items():
            assert field.description, f"{table.__name__}.{key}"
            assert f"`{key}`" in text
