"""The run file to start from is a good one."""

import pytest

from tracer.engine.runspec.load import parse_run
from tracer.engine.runspec.template import run_file_template


@pytest.mark.parametrize("title", ["Helium over Harrow", 'Öl "über" \\ Harrow'])
def test_template_loads_as_it_is(title: str) -> None:
    spec = parse_run(run_file_template(title), "new.toml")
    assert spec.title == title
    assert spec.body.name == "Harrow"


def test_template_shows_a_sun_that_loads_without_its_comment_marks() -> None:
    text = run_file_template("x")
    sun = parse_run(text.replace("\n# ", "\n"), "new.toml").sun
    assert parse_run(text, "new.toml").sun is None
    assert sun is not None
    shown = {key for key in type(sun).model_fields if f"\n# {key} = " in text}
    assert shown == type(sun).model_fields.keys() - {"epoch", "distance", "radial_velocity"}


def test_template_explains_its_keys() -> None:
    lines = run_file_template("x").splitlines()
    assert sum("#" in line for line in lines) > 10
    assert max(map(len, lines)) <= 110


def test_template_shows_ground_that_lets_atoms_go_and_traps_others() -> None:
    ground = parse_run(run_file_template("x").replace("\n# ", "\n"), "new.toml").surface
    assert ground.adsorbed == "desorbed"
    assert ground.desorption is not None
    assert ground.cold_traps is not None
