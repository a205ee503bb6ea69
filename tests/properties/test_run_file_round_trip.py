"""What is written from a run file reads back as the same; what is spoilt is refused in plain words."""

import copy
import re
import tomllib
from typing import Any

import pytest
import tomli_w
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.strategies import DrawFn, SearchStrategy

from tracer.engine.runspec.image import product_name
from tracer.engine.runspec.load import parse_run
from tracer.engine.runspec.template import run_file_template
from tracer.engine.runspec.writing import run_file_text
from tracer.errors import InputError

LINES = st.text(st.characters(exclude_categories=("Cc", "Cs", "Zl", "Zp")), min_size=1, max_size=12).filter(
    str.strip
)


def quantities(low: float, high: float, *units: str) -> SearchStrategy[str]:
    # Smaller ones would vanish in SI units and be refused as 0.
    values = st.floats(low or 1e-250, high)
    return st.tuples(values, st.sampled_from(units)).map(lambda drawn: f"{drawn[0]!r} {drawn[1]}")


def rising(low: float, high: float, *units: str) -> SearchStrategy[list[str]]:
    ends = st.lists(st.integers(int(low), int(high)), min_size=2, max_size=2, unique=True).map(sorted)
    return st.tuples(ends, st.sampled_from(units)).map(
        lambda drawn: [f"{end} {drawn[1]}" for end in drawn[0]]
    )


def table(required: dict[str, Any], optional: dict[str, Any] | None = None) -> SearchStrategy[dict[str, Any]]:
    return st.fixed_dictionaries(required, optional=optional)


def lists_of_named(entries: SearchStrategy[dict[str, Any]]) -> SearchStrategy[list[dict[str, Any]]]:
    return st.lists(entries, max_size=2, unique_by=lambda entry: entry["name"])


def law(name: str, **keys: Any) -> SearchStrategy[dict[str, Any]]:
    return table({"law": st.just(name), **keys})


LENGTHS = quantities(0.0, 1e9, "km", "m", "radii")
TEMPERATURES = quantities(0.0, 1e5, "K", "mK")
RATES = quantities(0.0, 1e30, "s-1", "1 / h", "Hz")
LATITUDES = st.floats(-90.0, 90.0).map(lambda angle: f"{angle!r} deg")
LOCAL_TIMES = st.floats(0.0, 24.0, exclude_max=True)
POINTS = table({"latitude": LATITUDES, "local_time": LOCAL_TIMES})
LAUNCH_TEMPERATURES = TEMPERATURES | st.just("surface")
POWERS = st.floats(0.0, 1e3) | st.integers(0, 9)
CELLS = st.integers(1, 4096)

SPEEDS = st.one_of(
    law("maxwell-flux", temperature=LAUNCH_TEMPERATURES),
    law("maxwell-gas", temperature=LAUNCH_TEMPERATURES),
    law("single", speed=quantities(0.0, 1e5, "km/s", "m s-1")),
    law(
        "sigmund-thompson",
        binding_energy=quantities(0.0, 9.0, "eV"),
        cutoff_energy=quantities(10.0, 1e4, "eV"),
    ),
    law("table", file=LINES),
)
DIRECTIONS = st.one_of(law("cosine", power=POWERS), law("cosine"), law("isotropic"), st.just("normal"))
PLACES = st.one_of(
    law("uniform"),
    law("cosine-power", toward=POINTS | st.sampled_from(["sun", "dawn"]), power=POWERS),
    law("patch", latitude=LATITUDES, local_time=LOCAL_TIMES, radius=LENGTHS),
    law("band", latitude=rising(-90, 90, "deg")),
    law("map", file=LINES, variable=LINES),
)
SURFACE_TEMPERATURES = st.one_of(
    law("uniform", value=TEMPERATURES),
    law("quarter-power", subsolar=TEMPERATURES, night=TEMPERATURES),
    law("hurley-2015"),
    st.just("hurley-2015"),
    law("map", file=LINES, variable=LINES),
)
HEAT = table({"thermal_inertia": quantities(1e-3, 1e5, "J m-2 K-1 s-1/2", "W m-2 K-1 s(1/2)")}) | table(
    {
        "conductivity": quantities(1e-6, 1e3, "W m-1 K-1"),
        "density": quantities(1.0, 1e4, "kg m-3", "g / l"),
        "heat_capacity": quantities(1.0, 1e4, "J kg-1 K-1"),
    }
)
EMISSIVITIES = st.floats(1e-3, 1.0)
SUNLIT_TEMPERATURES = st.one_of(
    law("equilibrium", albedo=st.floats(0.0, 1.0), emissivity=EMISSIVITIES, night=TEMPERATURES),
    st.tuples(law("conduction", albedo=st.floats(0.0, 0.99), emissivity=EMISSIVITIES), HEAT).map(
        lambda drawn: drawn[0] | drawn[1]
    ),
)
STICKINGS = st.floats(0.0, 1.0) | law(
    "exponential", at=TEMPERATURES, value=st.floats(0.0, 1.0), e_folding=TEMPERATURES
)
RELEASES = st.lists(
    table({"name": LINES, "rate": RATES, "speed": SPEEDS}, {"direction": DIRECTIONS, "place": PLACES}),
    min_size=1,
    max_size=3,
    unique_by=lambda release: release["name"],
)
VIEWERS = POINTS | st.sampled_from(["north", "south", "dawn", "dusk", "sun", "midnight"])


@st.composite
def velocities(draw: DrawFn) -> dict[str, Any]:
    low, high = draw(rising(-40, 40, "km/s", "m/s"))
    return {"from": low, "to": high, "bins": draw(CELLS)}


FRAMES = rising(-40, 40, "radii", "km")
IMAGES = st.lists(
    table(
        {
            "name": LINES,
            "look_from": VIEWERS,
            "horizontal": FRAMES,
            "vertical": FRAMES,
            "pixels": st.lists(CELLS, min_size=2, max_size=2),
        },
        {"velocity": velocities()},
    ),
    max_size=2,
    unique_by=lambda image: product_name(image["name"]),
)
BODIES = table(
    {"name": LINES},
    {
        "radius": quantities(0.0, 1e4, "km"),
        "gm": st.just("0 km3 s-2") | quantities(0.0, 1e6, "km3 s-2"),
        "rotation_period": quantities(-100.0, -1.0, "d") | quantities(1.0, 100.0, "h"),
        "orbit": table(
            {
                "semi_major_axis": quantities(0.0, 40.0, "au"),
                "eccentricity": st.floats(0.0, 1.0, exclude_max=True),
            }
        ),
        "host": table(
            # Locked ground would need a body without a rotation period.
            {"rotation": st.just("turning")},
            {
                "gm": quantities(0.0, 1e9, "km3 s-2"),
                "radius": quantities(0.0, 1e5, "km"),
                "distance": quantities(0.0, 1e7, "km"),
                "period": quantities(-100.0, -1.0, "d") | quantities(1.0, 100.0, "h"),
                "phase_angle": quantities(-1e3, 1e3, "deg", "rad"),
            },
        ),
    },
)
SUN_KEYS = {
    "tide": st.booleans(),
    "motion": st.just("stationary"),
    "shadow": st.sampled_from(["penumbra", "cylinder", "none"]),
    "solar_activity": st.floats(0.0, 1.0),
}
SUNS = st.one_of(
    table({"true_anomaly": quantities(-1e6, 1e6, "deg", "rad")}, SUN_KEYS),
    table(
        {"distance": quantities(0.0, 40.0, "au")},
        {"radial_velocity": quantities(-100.0, 100.0, "km/s"), **SUN_KEYS},
    ),
)
SWITCHED_OFF = {"photoionization_rate": st.just("0 s-1"), "radiation_acceleration": st.just("none")}
EMISSION_LINES = table(
    {
        "name": LINES,
        "wavelength": quantities(1.0, 1e5, "nm", "AA"),
        "g": st.just("0 s-1") | RATES | table({"file": LINES}),
    }
)
LIT = {
    "photoionization_rate": st.just("0 s-1") | RATES,
    "radiation_acceleration": st.sampled_from(["lines", "none"]) | quantities(0.0, 9.0, "m s-2", "cm/s2"),
    "line": lists_of_named(EMISSION_LINES),
}
LIT_LOSS = {
    "scaling": st.sampled_from(["inverse-square", "constant"]),
    "where": st.sampled_from(["everywhere", "sunlight"]),
}


def gases(light: dict[str, Any], loss: dict[str, Any]) -> SearchStrategy[dict[str, Any]]:
    losses = lists_of_named(table({"name": LINES, "rate": RATES}, loss))
    return table({"species": LINES}, {"mass": quantities(0.0, 300.0, "u", "Da"), "loss": losses, **light})


TRAPS = st.one_of(
    table({"poleward_of": quantities(0.0, 90.0, "deg")}), table({"file": LINES, "variable": LINES})
)
PHOTON = table(
    {
        "cross_section": quantities(0.0, 1.0, "cm2", "m2"),
        "photon_flux": quantities(0.0, 1e16, "cm-2 s-1"),
        "speed": SPEEDS,
    }
)
BOND = {
    "energy": quantities(0.0, 9.0, "eV", "kJ/mol"),
    "attempt_frequency": quantities(0.0, 1e15, "s-1", "THz"),
}


def grounds(temperatures: SearchStrategy[Any], light: dict[str, Any]) -> SearchStrategy[dict[str, Any]]:
    required = {"temperature": temperatures}
    optional = {"sticking": STICKINGS, "accommodation": st.floats(0.0, 1.0), "cold_traps": TRAPS}
    held = {"adsorbed": st.just("desorbed"), "desorption": table(BOND, light)}
    return st.one_of(table(required, optional), table({**required, **held}, optional))


SKIES = st.one_of(
    table({"gas": gases(SWITCHED_OFF, {}), "surface": grounds(SURFACE_TEMPERATURES, {})}),
    table(
        {
            "sun": SUNS,
            "gas": gases(LIT, LIT_LOSS),
            "surface": grounds(SURFACE_TEMPERATURES | SUNLIT_TEMPERATURES, {"photon": PHOTON}),
        }
    ),
)
WHOLE = st.integers(0, 2**63 - 1)


@st.composite
def run_files(draw: DrawFn) -> dict[str, Any]:
    required = {"title": LINES, "body": BODIES, "release": RELEASES}
    altitude = table({"first_cell": quantities(0.0, 9.0, "km"), "top": quantities(0.01, 9.0, "Mm", "radii")})
    optional = {
        "domain": table(
            {}, {"outer_radius": quantities(1.001, 1e3, "radii"), "age_limit": quantities(0.0, 1e3, "d")}
        ),
        "grid": table({}, {"altitude": altitude, "latitude_cells": CELLS, "local_time_cells": CELLS}),
        "image": IMAGES,
        "ensemble": table({}, {"batches": st.integers(2, 10**6), "seed": WHOLE, "replicates": WHOLE}),
    }
    return {**draw(table(required, optional)), **draw(SKIES)}


@settings(max_examples=200, deadline=None)
@given(run_files())
def test_written_run_file_reads_back_as_the_same(tables: dict[str, Any]) -> None:
    spec = parse_run(tomli_w.dumps(tables), "drawn.toml")
    text = run_file_text(spec)
    again = parse_run(text, "elsewhere/again.toml")
    assert again == spec
    assert run_file_text(again) == text


def test_defaults_are_written_out() -> None:
    shortest = """
    title = "x"
    body = { name = "Moon" }
    gas = { species = "He", loss = [{ name = "a", rate = "0 s-1" }] }
    release = [{ name = "a", rate = "1 s-1", speed = { law = "single", speed = "1 km/s" } }]
    surface = { temperature = { law = "uniform", value = "250 K" } }
    """
    written = tomllib.loads(run_file_text(parse_run(shortest, "x.toml")))
    release = written["release"][0]
    assert written["gas"]["loss"][0].keys() == {"name", "rate", "scaling", "where"}
    assert release["direction"] == {"law": "cosine", "power": 1.0}
    assert release["place"] == {"law": "uniform"}
    assert written["surface"].keys() == {"temperature", "sticking", "adsorbed", "accommodation"}
    assert "sun" not in written
    assert written["domain"] == {"age_limit": "1 yr"}
    assert written["grid"].keys() == {"altitude", "latitude_cells", "local_time_cells"}
    assert written["ensemble"].keys() == {
        "particles_per_batch",
        "batches",
        "seed",
        "replicates",
        "emphasis",
        "speed_bins",
    }


SPOILT = st.one_of(
    st.none(),
    st.booleans(),
    st.integers(),
    st.floats(),
    st.text(max_size=9),
    st.lists(st.integers(), max_size=3),
    st.dictionaries(st.text(max_size=5), st.integers(), max_size=2),
    st.dates(),
)
FOREIGN_WORDS = re.compile(
    r"pydantic|input should|extra inputs|field required|valid (string|number|boolean|tuple|dictionary)|\[type=",
    re.IGNORECASE,
)


@settings(max_examples=300, deadline=None)
@given(st.data())
def test_spoilt_run_file_is_refused_on_one_line_in_our_words(data: st.DataObject) -> None:
    tables = tomllib.loads(run_file_template("Helium over Harrow"))
    tables["release"][0]["place"] = {"law": "cosine-power", "power": 1, "toward": "sun"}
    tables["sun"] = {"true_anomaly": "60 deg", "tide": True, "shadow": "none"}
    tables["gas"]["radiation_acceleration"] = "lines"
    tables["surface"]["sticking"] = {"law": "exponential", "at": "9 K", "value": 0.5, "e_folding": "9 K"}
    tables["surface"]["adsorbed"] = "desorbed"
    photon = {
        "cross_section": "1 cm2",
        "photon_flux": "1 m-2 s-1",
        "speed": {"law": "single", "speed": "1 m/s"},
    }
    tables["surface"]["desorption"] = {"energy": "1 eV", "attempt_frequency": "1 s-1", "photon": photon}
    tables["surface"]["cold_traps"] = {"poleward_of": "80 deg"}
    tables["image"][0]["velocity"] = {"from": "-1 km/s", "to": "1 km/s", "bins": 4}
    tables["gas"]["line"] = [{"name": "a", "wavelength": "285 nm", "g": {"file": "g.csv"}}]
    _spoil(data, tables)
    try:
        parse_run(tomli_w.dumps(tables), "spoilt.toml")
    except InputError as refusal:
        message = str(refusal)
        assert len(message.splitlines()) == 1
        assert message.startswith("spoilt.toml: ")
        assert not FOREIGN_WORDS.search(message)
        # A law's name is no key, so it must not stand in the path.
        assert not re.match(
            r"spoilt\.toml: \S*\.(maxwell-flux|cosine-power|cosine|quarter-power)[.:]", message
        )


def _spoil(data: st.DataObject, tables: dict[str, Any]) -> None:
    """Replace, remove or add one value somewhere in the tables."""
    holder: Any = tables
    while True:
        keys = list(holder) if isinstance(holder, dict) else list(range(len(holder)))
        key = data.draw(st.sampled_from(keys))
        if isinstance(holder[key], dict | list) and holder[key] and data.draw(st.booleans()):
            holder = holder[key]
            continue
        value = data.draw(SPOILT)
        if value is None:
            del holder[key]
        elif isinstance(holder, dict) and data.draw(st.booleans()):
            holder[data.draw(st.text(max_size=8))] = value
        else:
            holder[key] = value
        return


def test_round_trip_test_sees_a_lost_key() -> None:
    spec = parse_run(run_file_template("Helium over Harrow"), "new.toml")
    tables = copy.deepcopy(spec.model_dump(exclude_none=True))
    del tables["body"]["orbit"]
    assert parse_run(tomli_w.dumps(tables), "lost.toml") != spec


def test_relative_paths_stay_as_written() -> None:
    change = 'release[1].speed={ law = "table", file = "../speeds/x.csv" }'
    spec = parse_run(run_file_template("x"), "some/where.toml", [change])
    assert 'file = "../speeds/x.csv"' in run_file_text(spec)


@pytest.mark.parametrize("value", ["1e24 s-1", "2.5e-7 s-1", "20 1 / h"])
def test_quantities_are_written_as_the_user_wrote_them(value: str) -> None:
    spec = parse_run(run_file_template("x"), "x.toml", [f'release[1].rate="{value}"'])
    assert f'rate = "{value}"' in run_file_text(spec)
