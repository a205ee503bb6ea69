"""A run file becomes a frozen spec with the documented defaults."""

import pickle
from pathlib import Path

import pytest
from pydantic import ValidationError

from tracer.engine.runspec.direction import Cosine, Normal
from tracer.engine.runspec.image import product_name
from tracer.engine.runspec.load import load_run, parse_run
from tracer.engine.runspec.place import Uniform
from tracer.engine.runspec.sticking import ExponentialSticking
from tracer.errors import InputError
from tracer.inputs.sky import SkyPoint
from tracer.units import Quantity

SHORTEST = """
title = "Helium over the Moon"
body = { name = "Moon" }
gas = { species = "He" }
surface = { temperature = { law = "uniform", value = "250 K" } }
[[release]]
name = "degassing"
rate = "1e24 s-1"
speed = { law = "single", speed = "1 km/s" }
"""


def test_defaults_are_the_documented_ones() -> None:
    spec = parse_run(SHORTEST, "moon.toml")
    release = spec.release[0]
    assert (release.direction, release.place) == (Cosine(power=1.0), Uniform())
    assert (spec.surface.sticking, spec.surface.adsorbed, spec.surface.accommodation) == (
        0.0,
        "captured",
        1.0,
    )
    assert (spec.domain.outer_radius, spec.domain.age_limit) == (None, Quantity(1.0, "yr"))
    altitude = spec.grid.altitude
    assert (altitude.first_cell, altitude.top, altitude.cells) == (
        Quantity(10.0, "km"),
        Quantity(10.0, "radii"),
        50,
    )
    assert (spec.grid.latitude_cells, spec.grid.local_time_cells) == (36, 48)
    ensemble = spec.ensemble
    assert (ensemble.particles_per_batch, ensemble.batches) == (20_000, 20)
    assert (ensemble.seed, ensemble.replicates) == (20310601, 20)
    assert (spec.body.radius, spec.body.gm, spec.body.rotation_period, spec.body.orbit) == (None,) * 4
    assert (spec.gas.mass, spec.gas.loss, spec.image) == (None, (), ())


def test_losses_act_constantly_and_everywhere_unless_told() -> None:
    text = SHORTEST.replace(
        '{ species = "He" }', '{ species = "He", loss = [{ name = "x", rate = "0 s-1" }] }'
    )
    loss = parse_run(text, "moon.toml").gas.loss[0]
    assert (loss.scaling, loss.where) == ("constant", "everywhere")


def test_spec_is_frozen() -> None:
    spec = parse_run(SHORTEST, "moon.toml")
    with pytest.raises(ValidationError):
        spec.title = "another"  # type: ignore[misc]


def test_whole_numbers_pass_for_real_ones() -> None:
    spec = parse_run(SHORTEST, "moon.toml", ["surface.sticking=1"])
    assert spec.surface.sticking == 1.0
    assert isinstance(spec.surface.sticking, float)


@pytest.mark.parametrize("seed", [0, 2**63 - 1])
def test_seed_fills_63_bits(seed: int) -> None:
    assert parse_run(SHORTEST, "moon.toml", [f"ensemble.seed={seed}"]).ensemble.seed == seed


def test_seed_beyond_63_bits_is_refused() -> None:
    with pytest.raises(InputError) as caught:
        parse_run(SHORTEST, "moon.toml", [f"ensemble.seed={2**63}"])
    assert str(caught.value) == (
        "moon.toml: ensemble.seed: 9223372036854775808 is out of range; must be at most 9223372036854775807"
    )


def test_law_may_be_given_by_its_name_alone() -> None:
    assert parse_run(SHORTEST, "moon.toml", ["release[1].direction=normal"]).release[0].direction == Normal()


def test_law_by_its_name_alone_still_needs_its_keys() -> None:
    with pytest.raises(InputError) as caught:
        parse_run(SHORTEST, "moon.toml", ["release[1].place=patch"])
    assert str(caught.value).startswith(
        "moon.toml: release[1].place.latitude: missing; must be a quantity of angle"
    )


def test_surface_needs_no_temperature_where_nothing_takes_it() -> None:
    text = SHORTEST.replace('temperature = { law = "uniform", value = "250 K" }', "sticking = 1")
    assert parse_run(text, "moon.toml").surface.temperature is None


def test_launch_at_the_surface_temperature_needs_one() -> None:
    text = SHORTEST.replace('temperature = { law = "uniform", value = "250 K" }', "sticking = 1").replace(
        '{ law = "single", speed = "1 km/s" }', '{ law = "maxwell-gas", temperature = "surface" }'
    )
    with pytest.raises(InputError) as caught:
        parse_run(text, "moon.toml")
    assert str(caught.value) == (
        "moon.toml: surface.temperature: missing; release[1].speed takes it; "
        'write for example { law = "uniform", value = "250 K" }'
    )


def test_direction_by_latitude_and_local_time() -> None:
    toward = '{ latitude = "5 deg", local_time = 9 }'
    change = f'release[1].place={{ law = "cosine-power", power = 2, toward = {toward} }}'
    place = parse_run(SHORTEST, "moon.toml", [change]).release[0].place
    assert place.law == "cosine-power"
    assert place.toward == SkyPoint(latitude=Quantity(5.0, "deg"), local_time=9.0)


@pytest.mark.parametrize("mark", [b"", b"\xef\xbb\xbf"])
def test_byte_order_mark_and_line_ends_make_no_difference(tmp_path: Path, mark: bytes) -> None:
    path = tmp_path / "moon.toml"
    path.write_bytes(mark + SHORTEST.replace("\n", "\r\n").encode())
    assert load_run(path) == parse_run(SHORTEST, "moon.toml")


def test_folder_is_known_but_is_neither_key_nor_part_of_equality(tmp_path: Path) -> None:
    path = tmp_path / "moon.toml"
    path.write_text(SHORTEST, encoding="utf-8")
    spec = load_run(path)
    assert (spec.file, spec.folder) == (str(path), tmp_path)
    elsewhere = parse_run(SHORTEST, "moon.toml")
    assert elsewhere.folder == Path.cwd()
    assert spec == elsewhere
    assert hash(spec) == hash(elsewhere)
    assert "folder" not in spec.model_dump()
    with pytest.raises(InputError, match="folder: unknown key"):
        parse_run(f'folder = "x"\n{SHORTEST}', "moon.toml")


def test_spec_survives_pickling_with_its_folder(tmp_path: Path) -> None:
    spec = parse_run(SHORTEST, tmp_path / "moon.toml")
    copy = pickle.loads(pickle.dumps(spec))
    assert copy == spec
    assert copy.folder == tmp_path


def test_specs_that_differ_in_one_key_differ() -> None:
    assert parse_run(SHORTEST, "moon.toml") != parse_run(SHORTEST, "moon.toml", ["ensemble.seed=1"])


@pytest.mark.parametrize(
    ("name", "product"), [("tail from north", "tail_from_north"), ("Tail-2 (µm)", "tail_2___m_"), ("ä", "_")]
)
def test_image_names_in_the_product(name: str, product: str) -> None:
    assert product_name(name) == product


def test_sticking_is_a_number_or_a_law() -> None:
    law = 'surface.sticking={ law = "exponential", at = "250 K", value = 0.5, e_folding = "272.8 K" }'
    sticking = parse_run(SHORTEST, "moon.toml", [law]).surface.sticking
    assert isinstance(sticking, ExponentialSticking)
    assert (sticking.value, str(sticking.at), str(sticking.e_folding)) == (0.5, "250 K", "272.8 K")


@pytest.mark.parametrize(
    ("sticking", "message"),
    [
        (
            '"exponential"',
            'surface.sticking: "exponential" is not a number; must be a number from 0 to 1 or { law = "exponential", '
            'at = "250 K", value = 0.5, e_folding = "272.8 K" }',
        ),
        ("-0.1", "surface.sticking: -0.1 is out of range; must be a number from 0 to 1"),
        ('{ law = "linear" }', 'surface.sticking.law: "linear" is not allowed; must be "exponential"'),
        (
            '{ law = "exponential", at = "250 K", value = 1.5, e_folding = "272.8 K" }',
            "surface.sticking.value: 1.5 is out of range; must be a number from 0 to 1",
        ),
        (
            '{ law = "exponential", at = "250 K", value = 0.5, e_folding = "-272.8 K" }',
            'surface.sticking.e_folding: "-272.8 K" is out of range; must be above 0 K',
        ),
        (
            '{ law = "exponential", at = "250 K", value = 0.5, efolding = "272.8 K" }',
            "surface.sticking.efolding: unknown key; did you mean e_folding?",
        ),
        ('{ value = 0.5, at = "250 K", e_folding = "1 K" }', "surface.sticking.law: missing; must be"),
    ],
)
def test_sticking_that_cannot_be(sticking: str, message: str) -> None:
    with pytest.raises(InputError) as caught:
        parse_run(SHORTEST, "moon.toml", [f"surface.sticking={sticking}"])
    assert str(caught.value).startswith(f"moon.toml: {message}")


def test_sticking_by_temperature_needs_one() -> None:
    law = 'sticking = { law = "exponential", at = "250 K", value = 0.5, e_folding = "272.8 K" }'
    with pytest.raises(InputError) as caught:
        parse_run(SHORTEST.replace('temperature = { law = "uniform", value = "250 K" }', law), "moon.toml")
    assert str(caught.value).startswith(
        'moon.toml: surface.temperature: missing; surface.sticking "exponential" takes it; '
    )
