"""The keys of `[surface]` that say what becomes of landed atoms, right and wrong."""

import pytest

from tracer.engine.runspec.load import parse_run
from tracer.engine.runspec.writing import run_file_text
from tracer.errors import InputError

GOOD = """
title = "Argon over Harrow"
body = { name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2", rotation_period = "60 d" }
gas = { species = "Ar" }
sun = { distance = "0.4 au" }
domain = { outer_radius = "40 radii" }
[[release]]
name = "interior"
rate = "1e24 s-1"
speed = { law = "maxwell-flux", temperature = "surface" }
[surface]
temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }
sticking = 1.0
adsorbed = "desorbed"
cold_traps = { poleward_of = "85 deg" }
[surface.desorption]
energy = "28 kJ/mol"
attempt_frequency = "1e13 s-1"
photon = { cross_section = "1e-20 cm2", photon_flux = "2e14 cm-2 s-1", speed = { law = "single", speed = "900 m/s" } }
"""

PHOTON = GOOD[GOOD.index("photon =") :]


def refusal(old: str, new: str) -> str:
    assert GOOD.count(old) == 1
    with pytest.raises(InputError) as caught:
        parse_run(GOOD.replace(old, new), "harrow.toml")
    return str(caught.value).removeprefix("harrow.toml: ")


def test_good_keys_come_back_as_they_were_written():
    spec = parse_run(GOOD, "harrow.toml")
    assert parse_run(run_file_text(spec), "harrow.toml") == spec
    assert str(spec.surface.desorption.energy) == "28 kJ/mol"


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (
            '"28 kJ/mol"',
            '"-0.29 eV"',
            'surface.desorption.energy: "-0.29 eV" is out of range; must be above 0 J',
        ),
        (
            '"28 kJ/mol"',
            '"0 eV"',
            'surface.desorption.energy: "0 eV" is out of range; must be above 0 J',
        ),
        (
            '"28 kJ/mol"',
            '"28 kJ/kg"',
            'surface.desorption.energy: "28 kJ/kg": "kJ/kg" is not a unit of energy; write for example "2 eV"',
        ),
        (
            '"1e13 s-1"',
            '"0 s-1"',
            'surface.desorption.attempt_frequency: "0 s-1" is out of range; must be above 0 s-1',
        ),
        (
            '"1e-20 cm2"',
            '"-1 cm2"',
            'surface.desorption.photon.cross_section: "-1 cm2" is out of range; must be above 0 m2',
        ),
        (
            '"2e14 cm-2 s-1"',
            '"2e14 cm-2"',
            'surface.desorption.photon.photon_flux: "2e14 cm-2": "cm-2" is not a unit of photon flux; '
            'write for example "2e14 cm-2 s-1"',
        ),
        (
            '"85 deg"',
            '"95 deg"',
            'surface.cold_traps.poleward_of: "95 deg" is out of range; must be from 0 deg to 90 deg',
        ),
        (
            '"85 deg"',
            '"-5 deg"',
            'surface.cold_traps.poleward_of: "-5 deg" is out of range; must be from 0 deg to 90 deg',
        ),
        (
            'poleward_of = "85 deg"',
            "",
            'surface.cold_traps.poleward_of: missing; either this or file and variable; write for example "85 deg"',
        ),
        (
            'poleward_of = "85 deg"',
            'poleward_of = "85 deg", file = "traps.nc", variable = "p"',
            "surface.cold_traps.file: stands beside poleward_of; must be one of the two",
        ),
        (
            'poleward_of = "85 deg"',
            'file = "traps.nc"',
            "surface.cold_traps.variable: missing; a map needs file and variable",
        ),
        (
            'poleward_of = "85 deg"',
            'pole_ward = "85 deg"',
            "surface.cold_traps.pole_ward: unknown key; did you mean poleward_of?",
        ),
        (
            '"desorbed"',
            '"captured"',
            'surface.desorption: has no effect while adsorbed is "captured"; must be "desorbed"',
        ),
        (
            '"desorbed"',
            '"released"',
            'surface.adsorbed: "released" is not allowed; must be "captured" or "desorbed"',
        ),
        (
            'sun = { distance = "0.4 au" }',
            "",
            "surface.desorption.photon: needs [sun]; without it there is no light",
        ),
        (
            'temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }\n',
            "",
            "surface.temperature: missing; release[1].speed takes it; write for example "
            '{ law = "uniform", value = "250 K" }',
        ),
    ],
)
def test_wrong_key_is_refused_in_plain_words(old, new, message):
    assert refusal(old, new).removesuffix(" (and 1 more problem)") == message


def test_desorbed_needs_desorption_and_desorption_a_temperature():
    text = GOOD[: GOOD.index("[surface.desorption]")]
    with pytest.raises(InputError, match=r'surface\.desorption: missing; adsorbed is "desorbed"; write for'):
        parse_run(text, "harrow.toml")
    cold = GOOD.replace('temperature = "surface"', 'temperature = "900 K"').replace(
        'temperature = { law = "quarter-power", subsolar = "600 K", night = "110 K" }\n', ""
    )
    with pytest.raises(InputError, match=r"surface\.temperature: missing; adsorbed atoms leave again by its"):
        parse_run(cold, "harrow.toml")
