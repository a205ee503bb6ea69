"""Quantities are read as written, refused in plain words, and converted to SI."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tracer.constants import ASTRONOMICAL_UNIT, ATOMIC_MASS
from tracer.units import DIMENSIONS, Quantity, conversion_factor, parse, quoted, si, si_unit


@pytest.mark.parametrize(
    ("text", "dimension", "value"),
    [
        ("1800 km", "length", 1.8e6),
        ("0.42 au", "length", 0.42 * ASTRONOMICAL_UNIT),  # IAU 2012 resolution B2
        ("285.296 nm", "wavelength", 2.85296e-7),
        ("1200K", "temperature", 1200.0),
        ("4.1 km/s", "speed", 4100.0),
        ("1e24 s-1", "rate", 1e24),
        ("60 1/h", "rate", 1.0 / 60.0),
        ("2 eV", "energy", 2 * 1.602176634e-19),  # SI 2019, exact
        ("28 kJ/mol", "energy", 28e3 / 6.02214076e23),  # of one atom; Avogadro constant exact (SI 2019)
        ("0.3 MJ mol-1", "energy", 3e5 / 6.02214076e23),
        ("23 u", "mass", 23 * ATOMIC_MASS),  # CODATA 2022
        ("1 yr", "time", 365.25 * 86400),  # Julian year, IAU
        ("9_500 km3 s-2", "gravitational parameter", 9.5e12),
        ("5 cm s-2", "acceleration", 0.05),
        ("195 nT", "magnetic field", 1.95e-7),
        ("50 cm-3", "number density", 5e7),
        ("1e-20 cm2", "area", 1e-24),
        ("2e14 cm-2 s-1", "photon flux", 2e18),
        ("0.01 W m-1 K-1", "thermal conductivity", 0.01),
        ("1.5 g cm-3", "mass density", 1500.0),
        ("0.6 J g-1 K-1", "heat capacity", 600.0),
        # The trade's spelling, with its power out of brackets, and others.
        ("50 J m-2 K-1 s-1/2", "thermal inertia", 50.0),
        ("50 J m-2 K-1 s(-1/2)", "thermal inertia", 50.0),
        ("50 J m-2 K-1 s-0.5", "thermal inertia", 50.0),
        ("50 W m-2 K-1 s1/2", "thermal inertia", 50.0),
        ("50 mJ cm-2 K-1 s^-1/2", "thermal inertia", 500.0),
    ],
)
def test_value_in_si_is_the_written_one(text: str, dimension: str, value: float) -> None:
    assert si(parse(text, dimension)) == pytest.approx(value, rel=1e-14)


@pytest.mark.parametrize(
    ("name", "wanted", "factor"),
    [
        ("K", "K", 1.0),
        ("kelvin", "K", 1.0),
        ("mK", "K", 1e-3),
        ("1", "1", 1.0),
        ("", "1", 1.0),
        ("percent", "1", 0.01),
        # Degrees Celsius count from another zero, and the rest is of another kind or nothing at all.
        ("deg_C", "K", None),
        ("degC", "K", None),
        ("m", "K", None),
        ("K", "1", None),
        ("nothing", "K", None),
    ],
)
def test_factor_between_the_units_of_files(name: str, wanted: str, factor: float | None) -> None:
    assert conversion_factor(name, wanted) == (None if factor is None else pytest.approx(factor, rel=1e-15))


def test_angles_stay_in_degrees() -> None:
    assert si(parse("30 deg", "angle")) == 30.0
    assert si(parse("1 rad", "angle")) == pytest.approx(180.0 / math.pi, rel=1e-14)


def test_radii_need_the_radius() -> None:
    quantity = parse("2.5 radii", "length or radii")
    assert si(quantity, radius=1.8e6) == 4.5e6
    with pytest.raises(ValueError, match="before the body's radius is known"):
        si(quantity)


@pytest.mark.parametrize("unit", ["Kelvins", "dB(K)", "mol"])
def test_what_is_of_no_dimension_in_use_has_no_value(unit: str) -> None:
    for asked in (lambda: si(Quantity(1.0, unit)), lambda: si_unit(unit)):
        with pytest.raises(ValueError, match="is not a unit of any dimension in use"):
            asked()


@pytest.mark.parametrize("text", ["1200 K", "1e24 s-1", "5.9e-6 s-1", "-8 radii", "0.1 km / s", "1e-7 s-1"])
def test_text_is_given_back_as_written(text: str) -> None:
    unit = text.split(maxsplit=1)[1]
    assert str(Quantity(float(text.split()[0]), unit)) == text


@given(st.floats(-1e290, 1e290), st.sampled_from(["K", "mK"]))
def test_parse_gives_back_what_was_written(value: float, unit: str) -> None:
    quantity = Quantity(value, unit)
    assert parse(str(quantity), "temperature") == quantity


@pytest.mark.parametrize("dimension", DIMENSIONS)
def test_every_example_is_of_its_dimension(dimension: str) -> None:
    assert math.isfinite(si(parse(DIMENSIONS[dimension].example, dimension), radius=1.0))


@pytest.mark.parametrize(
    ("given", "message"),
    [
        (1200, '1200 has no unit; write for example "1200 K"'),
        ("1200", '"1200" has no unit; write for example "1200 K"'),
        (True, 'true is not a temperature; write for example "1200 K"'),
        ("hot", '"hot" is not a number with a unit; write for example "1200 K"'),
        ("nan K", '"nan K" is not finite; write for example "1200 K"'),
        ("1e999 K", '"1e999 K" is not finite; write for example "1200 K"'),
        ("1e308 kK", '"1e308 kK" is too large to be a number in K'),
        ("5 Kelvins", '"5 Kelvins": "Kelvins" is not a known unit; write for example "1200 K"'),
        ("5 3 K", '"5 3 K": "3 K" is not a known unit; write for example "1200 K"'),
        ("5 dB(K)", '"5 dB(K)": "dB(K)" is not a known unit; write for example "1200 K"'),
        ("5 km", '"5 km": "km" is not a unit of temperature; write for example "1200 K"'),
        ("5 deg_C", '"5 deg_C": "deg_C" is not a unit of temperature; write for example "1200 K"'),
        ("5 radii", '"5 radii": "radii" is not allowed here; write for example "1200 K"'),
    ],
)
def test_what_is_no_temperature_is_refused_in_plain_words(given: object, message: str) -> None:
    with pytest.raises(ValueError, match=r".") as refusal:
        parse(given, "temperature")
    assert str(refusal.value) == message


@given(st.text(max_size=12))
def test_no_unit_text_breaks_the_reader(unit: str) -> None:
    message, quantity = "one line", None
    try:
        quantity = parse(f"1 {unit}", "length")
    except ValueError as refusal:
        message = str(refusal)
    assert len(message.splitlines()) == 1
    assert quantity is None or math.isfinite(si(quantity))


def test_values_in_messages_stay_on_one_printable_line() -> None:
    assert quoted("a\nb\x1b\u2028") == '"a\\nb\\u001b\\u2028"'
    assert len(quoted("x" * 1000)) == 60
