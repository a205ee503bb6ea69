"""The keys of sunlight: what they mean when left out, and what is refused."""

import tomllib

import pytest

from tracer.engine.runspec.load import parse_run
from tracer.engine.runspec.run import RunSpec
from tracer.engine.runspec.spectral_line import GTable
from tracer.engine.runspec.template import run_file_template
from tracer.engine.runspec.writing import run_file_text
from tracer.errors import InputError
from tracer.units import Quantity

DARK = run_file_template("Sodium over Harrow")
SUN = 'sun={ true_anomaly = "60 deg" }'
LINE = 'name = "mg_2852", wavelength = "285.296 nm"'
LINES = f'gas.line=[{{ {LINE}, g = "0.5 s-1" }}]'


def spec(*changes: str) -> RunSpec:
    return parse_run(DARK, "harrow.toml", changes)


def refusal(*changes: str) -> str:
    with pytest.raises(InputError) as caught:
        spec(*changes)
    return str(caught.value).removeprefix("harrow.toml: ")


def test_without_sun_there_is_no_light() -> None:
    dark = spec()
    assert (dark.sun, dark.gas.photoionization_rate, dark.gas.radiation_acceleration, dark.gas.line) == (
        None,
        None,
        None,
        (),
    )


def test_defaults_of_the_sun_are_the_documented_ones() -> None:
    sun = spec(SUN).sun
    assert sun is not None
    assert (sun.true_anomaly, sun.distance, sun.radial_velocity) == (Quantity(60.0, "deg"), None, None)
    assert (sun.tide, sun.motion, sun.shadow, sun.solar_activity) == (True, "stationary", "penumbra", 0.0)


def test_body_at_a_distance_stands_still_unless_told() -> None:
    still, moving = spec("sun.distance=0.4 au"), spec("sun.distance=0.4 au", "sun.radial_velocity=-8 km/s")
    assert still.sun is not None
    assert moving.sun is not None
    assert still.sun.radial_velocity == Quantity(0.0, "km/s")
    assert moving.sun.radial_velocity == Quantity(-8.0, "km/s")


def test_velocity_is_written_out_beside_a_distance_and_not_beside_a_true_anomaly() -> None:
    at_distance = tomllib.loads(run_file_text(spec("sun.distance=0.4 au")))["sun"]
    on_orbit = tomllib.loads(run_file_text(spec(SUN)))["sun"]
    assert at_distance["radial_velocity"] == "0 km/s"
    assert "radial_velocity" not in on_orbit


@pytest.mark.parametrize("angle", ["-30 deg", "750 deg", "7 rad"])
def test_true_anomaly_may_be_any_angle(angle: str) -> None:
    sun = spec(f"sun.true_anomaly={angle}").sun
    assert sun is not None
    assert str(sun.true_anomaly) == angle


def test_g_is_one_rate_or_a_file() -> None:
    rate = spec(SUN, LINES).gas.line[0]
    table = spec(SUN, f'gas.line=[{{ {LINE}, g = {{ file = "g.csv" }} }}]').gas.line[0]
    assert (rate.name, rate.wavelength, rate.g) == (
        "mg_2852",
        Quantity(285.296, "nm"),
        Quantity(0.5, "s-1"),
    )
    assert table.g == GTable(file="g.csv")


@pytest.mark.parametrize(
    ("given", "kept"),
    [("lines", "lines"), ("none", "none"), ("0.05 m s-2", Quantity(0.05, "m s-2"))],
)
def test_push_is_a_word_or_an_acceleration(given: str, kept: object) -> None:
    assert spec(SUN, f"gas.radiation_acceleration={given}").gas.radiation_acceleration == kept


def test_losses_may_follow_the_light() -> None:
    loss = spec(SUN, "gas.loss[1].scaling=inverse-square", "gas.loss[1].where=sunlight").gas.loss[0]
    assert (loss.scaling, loss.where) == ("inverse-square", "sunlight")


def test_light_may_be_switched_off_where_there_is_none() -> None:
    gas = spec("gas.photoionization_rate=0 s-1", "gas.radiation_acceleration=none").gas
    assert (gas.photoionization_rate, gas.radiation_acceleration) == (Quantity(0.0, "s-1"), "none")


@pytest.mark.parametrize(
    ("sun", "message"),
    [
        (
            "",
            'true_anomaly: missing; one of true_anomaly, epoch and distance is needed; write for example "60 deg"',
        ),
        (
            'true_anomaly = "60 deg", distance = "0.4 au"',
            'distance: "0.4 au" stands beside true_anomaly "60 deg"; must be one of the two',
        ),
        (
            'true_anomaly = "60 deg", radial_velocity = "8 km/s"',
            'radial_velocity: "8 km/s" needs distance; with true_anomaly it follows from the orbit',
        ),
    ],
)
def test_place_of_the_body(sun: str, message: str) -> None:
    assert refusal(f"sun={{ {sun} }}") == f"sun.{message}"


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (
            "gas.photoionization_rate=5.9e-6 s-1",
            'photoionization_rate: "5.9e-6 s-1" needs [sun]; without it there is no light; must be left out or '
            '"0 s-1"',
        ),
        (
            "gas.radiation_acceleration=lines",
            'radiation_acceleration: "lines" needs [sun]; without it there is no light; must be left out or '
            '"none"',
        ),
        (LINES, 'line[1]: "mg_2852" needs [sun]; without it there is no light'),
    ],
)
def test_light_without_sun(change: str, message: str) -> None:
    assert refusal(change) == f"gas.{message}"


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (
            "scaling=inverse-square",
            'scaling: "inverse-square" needs [sun]; without it there is no distance from the Sun; must be '
            '"constant"',
        ),
        (
            "where=sunlight",
            'where: "sunlight" needs [sun]; without it there is no light; must be "everywhere"',
        ),
    ],
)
def test_loss_by_light_without_sun(change: str, message: str) -> None:
    assert refusal(f"gas.loss[1].{change}") == f"gas.loss[1].{message}"


@pytest.mark.parametrize(
    ("key", "entry"),
    [("gas.line", f'{{ {LINE}, g = "0 s-1" }}'), ("gas.loss", '{ name = "mg_2852", rate = "1 s-1" }')],
)
def test_repeated_name(key: str, entry: str) -> None:
    message = refusal(SUN, f"{key}=[{entry}, {entry}]")
    assert message == f'{key}[2].name: "mg_2852" is already the name of {key}[1]'


@pytest.mark.parametrize(
    ("g", "message"),
    [
        (
            '"g.csv"',
            'g: "g.csv" is not a number with a unit; write for example "1e24 s-1" or { file = "g.csv" }',
        ),
        ('"-1 s-1"', 'g: "-1 s-1" is out of range; must be at least 0 s-1'),
        ('{ flie = "g.csv" }', "g.flie: unknown key; did you mean file?"),
    ],
)
def test_g(g: str, message: str) -> None:
    assert refusal(SUN, f"gas.line=[{{ {LINE}, g = {g} }}]") == f"gas.line[1].{message}"


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ("sun.tide=1", "tide: 1 is not allowed; must be true or false"),
        (
            "sun.shadow=umbra",
            'shadow: "umbra" is not allowed; must be "penumbra" or "cylinder" or "none"',
        ),
    ],
)
def test_choice(change: str, message: str) -> None:
    assert refusal(SUN, change) == f"sun.{message}"
