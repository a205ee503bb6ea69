"""Every kind of bad run file is refused with one clear message."""

from pathlib import Path
from typing import Any

import pytest

from tracer.engine.runspec.load import load_run, parse_run
from tracer.errors import InputError

GOOD = """
title = "Sodium over Harrow"
[body]
name = "Harrow"
radius = "1800 km"
gm = "9500 km3 s-2"
[gas]
species = "Na"
[[gas.loss]]
name = "charge exchange"
rate = "1e-7 s-1"
[[release]]
name = "desorption"
rate = "2e24 s-1"
speed = { law = "maxwell-flux", temperature = "1200 K" }
[[release]]
name = "sputtering"
rate = "1e22 s-1"
speed = { law = "sigmund-thompson", binding_energy = "2 eV", cutoff_energy = "2 keV" }
place = { law = "band", latitude = ["-30 deg", "30 deg"] }
[surface]
temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }
sticking = 0.5
[domain]
outer_radius = "40 radii"
[grid]
altitude = { first_cell = "10 km", top = "5000 km", cells = 50 }
[[image]]
name = "tail from north"
look_from = "north"
horizontal = ["-35 radii", "5 radii"]
vertical = ["-8 radii", "8 radii"]
pixels = [320, 128]
[ensemble]
batches = 20
"""

SPEED_LAWS = '"maxwell-flux", "maxwell-gas", "single", "sigmund-thompson", "table"'
SIX_WORDS = '"north", "south", "dawn", "dusk", "sun", "midnight"'


def refusal(text: str) -> str:
    with pytest.raises(InputError) as caught:
        parse_run(text, "harrow.toml")
    return str(caught.value)


def check(old: str, new: str, message: str) -> None:
    assert GOOD.count(old) == 1
    assert refusal(GOOD.replace(old, new)) == f"harrow.toml: {message}"


def test_the_good_file_is_good() -> None:
    assert parse_run(GOOD, "harrow.toml").title == "Sodium over Harrow"


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('"1800 km"', "1800", 'body.radius: 1800 has no unit; write for example "1800 km"'),
        (
            '"1200 K"',
            '"1200"',
            'release[1].speed.temperature: "1200" has no unit; write for example "1200 K" or "surface"',
        ),
        (
            '"2e24 s-1"',
            '"2e24 atoms/s"',
            'release[1].rate: "2e24 atoms/s": "atoms/s" is not a known unit; write for example "1e24 s-1"',
        ),
    ],
)
def test_unit(old: str, new: str, message: str) -> None:
    check(old, new, message)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            '"9500 km3 s-2"',
            '"9500 kg"',
            'body.gm: "9500 kg": "kg" is not a unit of gravitational parameter; '
            'write for example "9500 km3 s-2"',
        ),
        (
            '"40 radii"',
            '"40 d"',
            'domain.outer_radius: "40 d": "d" is not a unit of length; write for example "10 radii"',
        ),
        (
            '"1800 km"',
            '"1 radii"',
            'body.radius: "1 radii": "radii" is not allowed here; write for example "1800 km"',
        ),
    ],
)
def test_dimension(old: str, new: str, message: str) -> None:
    check(old, new, message)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            '"1800 km"',
            '"-1 km"',
            'body.radius: "-1 km" is out of range; must be above 0 m and at most 1e+18 m',
        ),
        (
            "sticking = 0.5",
            "sticking = 1.5",
            "surface.sticking: 1.5 is out of range; must be a number from 0 to 1",
        ),
        (
            "cells = 50",
            "cells = 4097",
            "grid.altitude.cells: 4097 is out of range; must be a whole number from 1 to 4096",
        ),
    ],
)
def test_range(old: str, new: str, message: str) -> None:
    check(old, new, message)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            'law = "quarter-power", subsolar = "600 K", night = "110 K"',
            'law = "equilibrium", albedo = 1.1, night = "110 K"',
            "surface.temperature.albedo: 1.1 is out of range; must be a number from 0 to 1",
        ),
        (
            'law = "quarter-power", subsolar = "600 K", night = "110 K"',
            'law = "equilibrium", albedo = 0.1, emissivity = 0, night = "110 K"',
            "surface.temperature.emissivity: 0 is out of range; must be a number above 0 and at most 1",
        ),
        ('"110 K"', '"-1 K"', 'surface.temperature.night: "-1 K" is out of range; must be above 0 K'),
        (
            "sticking = 0.5",
            "sticking = 0.5\naccommodation = 1.2",
            "surface.accommodation: 1.2 is out of range; must be a number from 0 to 1",
        ),
        (
            'law = "quarter-power", subsolar = "600 K", night = "110 K"',
            'law = "equilibrium", albedo = 0.1, night = "110 K"',
            'surface.temperature: "equilibrium" needs [sun]; without it there is no distance from the Sun',
        ),
        (
            '"band", latitude = ["-30 deg", "30 deg"]',
            '"map", file = "flux.nc"',
            "release[2].place.variable: missing; must be text",
        ),
    ],
)
def test_surface_that_cannot_be(old: str, new: str, message: str) -> None:
    check(old, new, message)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            "sticking = 0.5",
            "sticking = true",
            "surface.sticking: true is not a number; must be a number from 0 to 1",
        ),
        (
            "batches = 20",
            "batches = 20.0",
            "ensemble.batches: 20.0 is not a whole number; must be a whole number at least 2",
        ),
        (
            "[320, 128]",
            "320",
            "image[1].pixels: 320 is not allowed; must be a list of 2, each a whole number from 1 to 4096",
        ),
    ],
)
def test_type(old: str, new: str, message: str) -> None:
    check(old, new, message)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            'temperature = "1200 K"',
            'temprature = "1200 K"',
            "release[1].speed.temprature: unknown key; did you mean temperature?",
        ),
        (
            "batches = 20",
            "threads = 2",
            "ensemble.threads: unknown key; allowed here: particles_per_batch, batches, seed, replicates, emphasis, "
            "speed_bins, stop",
        ),
        (
            "[ensemble]",
            "[host]\n[ensemble]",
            "host: unknown key; allowed here: title, body, sun, gas, release, surface, domain, grid, image, "
            "ensemble",
        ),
    ],
)
def test_unknown_key(old: str, new: str, message: str) -> None:
    check(old, new, message)


VELOCITY = "image[1].velocity"


@pytest.mark.parametrize(
    ("table", "message"),
    [
        (
            '{ from = "-3 km/s", to = "3 km/s", bin = 6 }',
            f"{VELOCITY}.bin: unknown key; did you mean bins?",
        ),
        (
            '{ form = "-3 km/s", to = "3 km/s", bins = 6 }',
            f"{VELOCITY}.form: unknown key; did you mean from?",
        ),
        (
            '{ from_ = "-3 km/s", to = "3 km/s", bins = 6 }',
            f"{VELOCITY}.from_: unknown key; did you mean from?",
        ),
        (
            '{ to = "3 km/s", bins = 6 }',
            f"{VELOCITY}.from: missing; must be a quantity of speed from -300000000 m s-1 to 300000000 m s-1, "
            'for example "2 km/s"',
        ),
        (
            '{ from = "3 km/s", to = "3000 m/s", bins = 6 }',
            f'{VELOCITY}.to: "3000 m/s" is not above from "3 km/s"',
        ),
        (
            '{ from = "-1e9 m/s", to = "3 km/s", bins = 6 }',
            f'{VELOCITY}.from: "-1000000000 m/s" is out of range; must be from -300000000 m s-1 to 300000000 m s-1',
        ),
        (
            '{ from = -3, to = "3 km/s", bins = 6 }',
            f'{VELOCITY}.from: -3 has no unit; write for example "2 km/s"',
        ),
        (
            '{ from = "-3 km/s", to = "3 km/s", bins = 0 }',
            f"{VELOCITY}.bins: 0 is out of range; must be a whole number from 1 to 4096",
        ),
        (
            '["-3 km/s", "3 km/s"]',
            f'{VELOCITY}: ["-3 km/s", "3 km/s"] is not allowed; must be one table in braces',
        ),
    ],
)
def test_velocity_of_an_image(table: str, message: str) -> None:
    check("pixels = [320, 128]", f"pixels = [320, 128]\nvelocity = {table}", message)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('title = "Sodium over Harrow"', "", "title: missing; must be text"),
        (
            'rate = "2e24 s-1"',
            "",
            "release[1].rate: missing; must be a quantity of rate above 0 s-1 and at most 1e+35 s-1, "
            'for example "1e24 s-1"',
        ),
        (
            'law = "maxwell-flux", ',
            "",
            f"release[1].speed.law: missing; must be one of {SPEED_LAWS}",
        ),
    ],
)
def test_missing(old: str, new: str, message: str) -> None:
    check(old, new, message)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            'temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }',
            "",
            "surface.temperature: missing; atoms bounce where sticking is below 1; "
            'write for example { law = "uniform", value = "250 K" }',
        ),
        ('"sputtering"', '"desorption"', 'release[2].name: "desorption" is already the name of release[1]'),
        (
            '"2 keV"',
            '"1 eV"',
            'release[2].speed.cutoff_energy: "1 eV" is too low; must be above binding_energy "2 eV"',
        ),
    ],
)
def test_conflict(old: str, new: str, message: str) -> None:
    check(old, new, message)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            '"maxwell-flux"',
            '"maxwel-flux"',
            'release[1].speed.law: "maxwel-flux" is not a law; did you mean "maxwell-flux"?',
        ),
        (
            '"quarter-power"',
            '"linear"',
            'surface.temperature.law: "linear" is not a law; must be one of "uniform", "quarter-power", '
            '"equilibrium", "hurley-2015", "map", "conduction"',
        ),
        (
            'look_from = "north"',
            'look_from = "up"',
            f'image[1].look_from: "up" is not a direction; must be {SIX_WORDS} or a table of latitude and '
            "local_time",
        ),
    ],
)
def test_word(old: str, new: str, message: str) -> None:
    check(old, new, message)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            '["-30 deg", "30 deg"]',
            '["30 deg", "-30 deg"]',
            'release[2].place.latitude: ["30 deg", "-30 deg"] is no band; the first must be below the second',
        ),
        (
            '["-35 radii", "5 radii"]',
            '["5 radii", "5 radii"]',
            'image[1].horizontal: ["5 radii", "5 radii"] has no width; the first must be below the second',
        ),
        (
            '"5000 km"',
            '"5 km"',
            'grid.altitude.top: "5 km" is too low; must be above first_cell "10 km"',
        ),
    ],
)
def test_order(old: str, new: str, message: str) -> None:
    check(old, new, message)


@pytest.mark.parametrize("outer", ['"1 radii"', '"1000 km"'])
def test_outer_radius_below_the_ground(outer: str) -> None:
    message = refusal(GOOD.replace('"40 radii"', outer))
    assert message.startswith(f"harrow.toml: domain.outer_radius: {outer} is not above the ground; ")


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('[[release]]\nname = "s', '[[releases]]\nname = "s', "releases: unknown key; did you mean release?"),
        (
            "[[image]]",
            "[image]",
            "image: a table is not allowed; must be a list of tables, each headed [[image]]",
        ),
        (
            "[body]",
            "[[body]]",
            "body: a list of tables is not allowed; must be one table, headed [body]",
        ),
    ],
)
def test_heading(old: str, new: str, message: str) -> None:
    check(old, new, message)


@pytest.mark.parametrize(
    ("first", "second", "message"),
    [
        (
            "Tail North",
            "tail north",
            '"tail north" becomes tail_north in the product, which collides with image[1]',
        ),
        ("tail-1", "tail.1", '"tail.1" becomes tail_1 in the product, which collides with image[1]'),
        (
            "tail",
            "tail standard error",
            '"tail standard error" becomes tail_standard_error in the product, which collides with image[1]',
        ),
    ],
)
def test_image_names_that_collide_in_the_product(first: str, second: str, message: str) -> None:
    image = GOOD[GOOD.index("[[image]]") : GOOD.index("[ensemble]")]
    text = GOOD.replace("tail from north", first) + image.replace("tail from north", second)
    assert refusal(text) == f"harrow.toml: image[2].name: {message}"


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('"1800 km"', '"1800 km', "line 5, column 18: not TOML: illegal character '\\n'"),
        (
            "sticking = 0.5",
            "sticking = 0.5\nsticking = 0.6",
            "line 24, column 15: not TOML: this key is already given",
        ),
        ("[ensemble]", "[body]\n[ensemble]", "line 34, column 6: not TOML: this table is already given"),
    ],
)
def test_syntax(old: str, new: str, message: str) -> None:
    check(old, new, message)


def test_lists_nested_too_deeply() -> None:
    assert refusal("a = " + "[" * 5000) == "harrow.toml: lists or tables are nested too deeply"


def test_further_problems_are_counted_and_unknown_keys_come_first() -> None:
    text = (
        GOOD.replace('rate = "2e24 s-1"', "")
        .replace("sticking = 0.5", "sticking = 2")
        .replace("night", "dark")
    )
    assert refusal(text) == (
        "harrow.toml: surface.temperature.dark: unknown key; allowed here: law, subsolar, night "
        "(and 3 more problems)"
    )


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (
            GOOD.replace("Harrow", "Härrow").encode("latin-1"),
            "line 2: byte 0xe4 is not UTF-8; save the file as UTF-8 text",
        ),
        (GOOD.encode("utf-16"), "line 1: byte 0xff is not UTF-8; save the file as UTF-8 text"),
    ],
)
def test_encoding(tmp_path: Path, content: bytes, message: str) -> None:
    path = tmp_path / "harrow.toml"
    path.write_bytes(content)
    with pytest.raises(InputError) as caught:
        load_run(path)
    assert str(caught.value) == f"{path}: {message}"


def test_files(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    absent = tmp_path / "absent.toml"
    with pytest.raises(InputError) as caught:
        load_run(absent)
    assert str(caught.value) == f"{absent}: no such file"
    with pytest.raises(InputError) as caught:
        load_run(tmp_path)
    assert str(caught.value) == f"{tmp_path}: is a folder; must be a run file"

    def forbidden(*_: Any) -> bytes:
        raise PermissionError

    monkeypatch.setattr(Path, "read_bytes", forbidden)
    with pytest.raises(InputError) as caught:
        load_run(absent)
    assert str(caught.value) == f"{absent}: no permission to read it"
