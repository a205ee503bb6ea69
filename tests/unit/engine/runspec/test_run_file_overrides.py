"""Single keys are changed before the run file is checked."""

import pytest

from tracer.engine.runspec.load import parse_run
from tracer.engine.runspec.overrides import override
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.template import run_file_template
from tracer.errors import InputError
from tracer.units import Quantity


def changed(*changes: str) -> RunSpec:
    return parse_run(run_file_template("Helium over Harrow"), "harrow.toml", changes)


def test_text_without_quotes_is_text() -> None:
    speed = changed("release[1].speed.temperature=1300 K").release[0].speed
    assert speed.law == "maxwell-flux"
    assert speed.temperature == Quantity(1300.0, "K")


def test_toml_values_are_read_as_such() -> None:
    spec = changed("ensemble.batches=7", "image[1].pixels=[10, 20]", 'title="a = b"', "gas.loss=[]")
    assert (spec.ensemble.batches, spec.image[0].pixels, spec.title, spec.gas.loss) == (
        7,
        (10, 20),
        "a = b",
        (),
    )


def test_entries_of_plain_lists_can_be_changed() -> None:
    assert changed("image[1].pixels[2]=64").image[0].pixels == (128, 64)


def test_missing_keys_and_tables_are_made() -> None:
    assert override({}, "surface.temperature.law=uniform") == {"surface": {"temperature": {"law": "uniform"}}}


def test_later_changes_win() -> None:
    assert changed("ensemble.seed=1", "ensemble.seed=2").ensemble.seed == 2


def test_given_tables_stay_as_they_are() -> None:
    given = {"release": [{"rate": "1 s-1"}]}
    assert override(given, "release[1].rate=2 s-1") == {"release": [{"rate": "2 s-1"}]}
    assert given == {"release": [{"rate": "1 s-1"}]}


def test_line_end_smuggles_no_second_key() -> None:
    assert override({}, "title=1\nseed = 2") == {"title": "1\nseed = 2"}


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ("title", '--set "title": must be key=value'),
        (
            "release[0].rate=1 s-1",
            '--set "release[0].rate=1 s-1": there is no release[0]; there are 1, counted from 1',
        ),
        ("title.length=3", '--set "title.length=3": there is no table that could hold length'),
        ("gas[1].mass=4 u", '--set "gas[1].mass=4 u": there is no gas[1]; gas is no list'),
        (
            "release..rate=1",
            '--set "release..rate=1": "" is not a key; write for example release[1].speed.temperature=1300 K',
        ),
        ("ensemble.seeds=3", "harrow.toml: ensemble.seeds: unknown key; did you mean seed?"),
    ],
)
def test_changes_that_lead_nowhere_are_refused(change: str, message: str) -> None:
    with pytest.raises(InputError) as caught:
        changed(change)
    assert str(caught.value) == message
