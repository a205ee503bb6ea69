"""What a run file inside a product tells, where it may be of any kind or none."""

import pytest

from tracer.product.run_file import entries, table, tables_of, value

RUN = """
[body]
radius = "1800 km"
rate = 3
[domain]
outer_radius = "20 radii"
[[release]]
name = "vapour"
"""


def test_tables_entries_and_values_are_those_of_the_run_file():
    run = tables_of(RUN)
    assert value(table(run, "body"), "radius", "length") == 1.8e6
    assert value(table(run, "domain"), "outer_radius", "length or radii", 2.0) == 40.0
    assert entries(run, "release") == [{"name": "vapour"}]


@pytest.mark.parametrize("text", ["", "no TOML at all", "a = " + "[" * 5000])
def test_a_text_that_is_no_run_file_has_no_tables(text):
    assert tables_of(text) == {}


def test_what_is_of_another_kind_counts_as_absent():
    run = tables_of(RUN)
    body = table(run, "body")
    assert value(body, "rate", "rate") is None
    assert value(body, "radius", "time") is None
    assert value(body, "gm", "gravitational parameter") is None
    assert table(body, "radius") == {}
    assert entries(run, "body") == []
    assert entries({"release": [1, {"name": "jet"}]}, "release") == [{"name": "jet"}]
