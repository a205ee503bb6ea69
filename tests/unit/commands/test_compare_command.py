"""`tracer compare` as people use it: a profile made from one product, explained by another with an independent seed."""

import json
from pathlib import Path

import numpy as np
import pytest

import tracer
from tracer.__main__ import main
from tracer.engine.runspec.load import parse_run
from tracer.engine.tracing import run
from tracer.observe.fit.sky import Aperture, Spread, Track
from tracer.observe.fit.smearing import smearing
from tracer.product.writing import save_product

RUN = """
title = "Sodium over Harrow, for a fit"
body = { name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2" }
sun = { distance = "0.35 au", radial_velocity = "8 km/s" }
gas = { species = "Na" }
surface = { sticking = 1.0 }
domain = { outer_radius = "12 radii", age_limit = "10 d" }
grid = { altitude = { cells = 4, top = "4 radii" }, latitude_cells = 4, local_time_cells = 6 }
[[release]]
name = "desorption"
rate = "2e24 s-1"
speed = { law = "maxwell-flux", temperature = "1200 K" }
place = { law = "cosine-power", toward = "sun", power = 1 }
[[release]]
name = "vapour"
rate = "5e23 s-1"
speed = { law = "maxwell-flux", temperature = "4000 K" }
place = { law = "cosine-power", toward = "dawn", power = 1 }
[[image]]
name = "tail"
look_from = "north"
horizontal = ["-8 radii", "3 radii"]
vertical = ["-3 radii", "3 radii"]
pixels = [44, 24]
[ensemble]
particles_per_batch = 1200
batches = 20
"""
OBSERVATION = """
title = "Tail of Harrow"
[profile]
file = "seen.csv"
position = "downtail_radii"
value = "brightness_kR"
sigma = "sigma_kR"
quantity = "brightness"
line = "na_d2"
along = "downtail"
[view]
look_from = "north"
[slit]
width = "1 radii"
length = "0.5 radii"
[seeing]
fwhm = "0.6 radii"
"""
RADIUS = 1.8e6
POSITIONS = np.arange(-1.5, 6.6, 0.5)
RATES = {"desorption": 3e24, "vapour": 9e23}


@pytest.fixture(scope="session")
def products():
    """Return the product that is fitted, with responses, and the one behind the profile, of another seed."""
    model = run(parse_run(RUN + "speed_bins = 12\n", "run file"), workers=1)
    return model, run(parse_run(RUN + "seed = 7\n", "run file"), workers=1)


@pytest.fixture
def folder(tmp_path, monkeypatch, products):
    monkeypatch.chdir(tmp_path)
    save_product(products[0], "model.nc")
    Path("seen.toml").write_text(OBSERVATION, encoding="utf-8")
    write_profile(products[1])
    return tmp_path


def write_profile(truth, factor=1.0):
    """Write what the truth's image shows through slit and seeing, at other rates, with noise of 10 %."""
    edges = [
        np.append(truth[f"tail_{axis}_bounds"].values[:, 0], truth[f"tail_{axis}_bounds"].values[-1, 1])
        for axis in ("vertical", "horizontal")
    ]
    track = Track(-POSITIONS * RADIUS, np.zeros(len(POSITIONS)), np.pi)
    weights = smearing(tuple(edges), track, Aperture(0.5 * RADIUS, RADIUS, np.pi), Spread(0.6 * RADIUS, None))
    images = truth.brightness_tail.sel(line="na_d2").values.reshape(2, -1)
    seen = np.array([1.5, 1.8]) @ (weights @ images.T).T / 1e3
    sigma = 0.1 * seen
    value = seen + sigma * np.random.default_rng(20310601).normal(size=len(seen))
    rows = [
        f"{x:.2f},{factor * v!r},{factor * s!r}"
        for x, v, s in zip(POSITIONS, value.tolist(), sigma.tolist(), strict=True)
    ]
    Path("seen.csv").write_text(
        "\n".join(["downtail_radii,brightness_kR,sigma_kR", *rows]) + "\n", encoding="utf-8"
    )


def ending_of(*words: str) -> int:
    with pytest.raises(SystemExit) as ended:
        main(["compare", *words])
    return ended.value.code or 0


def test_rates_behind_a_profile_are_found(folder, capsys):
    assert ending_of("model.nc", "seen.toml", "--json") == 0
    found = json.loads(capsys.readouterr().out)
    for name, rate in RATES.items():
        estimate = found["rates"][name]
        assert estimate["low95"] < rate < estimate["high95"]
        assert (
            estimate["low95"] < estimate["low68"] < estimate["best"] < estimate["high68"] < estimate["high95"]
        )
    assert found["degrees_of_freedom"] == len(POSITIONS) - 2
    # 1e-4 and 1 - 1e-4 of the chi-square distribution: one false alarm in 5,000.
    assert 1e-4 < found["probability"] < 1.0 - 1e-4
    points = found["points"]
    np.testing.assert_allclose(
        sum(np.array(part) for part in points["parts"].values()), points["model"], rtol=1e-9
    )
    assert points["unit"] == "kR"
    assert len(found["residuals"]) == len(POSITIONS)
    assert max(map(abs, found["residuals"])) < 4.5
    assert not found["range_ends"]["calibrated"]
    np.testing.assert_allclose(
        found["range_ends"]["rises"]["vapour: rate"], [[1.0, 1.0], [3.8415, 3.8415]], rtol=1e-4
    )
    assert any("not calibrated: all that is free enters linearly" in words for words in found["statements"])
    assert found["correlations"]["names"] == ["desorption: rate", "vapour: rate"]


def test_temperature_is_fitted_from_responses(folder, capsys):
    fitted = '[fit]\n[[fit.release]]\nname = "vapour"\ntemperature = ["1500 K", "10000 K"]\n'
    Path("seen.toml").write_text(OBSERVATION + fitted, encoding="utf-8")
    assert ending_of("model.nc", "seen.toml", "--json") == 0
    found = json.loads(capsys.readouterr().out)
    estimate = found["parameters"]["vapour"]["temperature"]
    assert 1500.0 <= estimate["low95"] < 4000.0 < estimate["high95"] <= 10000.0
    assert found["degrees_of_freedom"] == len(POSITIONS) - 3
    ends = found["range_ends"]
    assert ends["calibrated"]
    assert ends["draws"] == 256
    assert sorted(ends["rises"]) == ["desorption: rate", "vapour: rate", "vapour: temperature"]
    # Of a range of 68.27 and of 95 %, at the lower end and at the upper.
    rises = np.array(list(ends["rises"].values()))
    assert rises.shape == (3, 2, 2)
    assert np.all(rises[:, 1] > rises[:, 0])


def test_results_and_figures_are_written_and_the_next_command_named(folder, capsys):
    assert ending_of("model.nc", "seen.toml", "-o", "fit.json", "-o", "fit.png") == 0
    shown = capsys.readouterr()
    assert "Tail of Harrow: brightness of na_d2, 17 points, seen from north" in shown.out
    assert "chi-square" in shown.out
    assert shown.out.endswith("fit.json\nfit.png\n")
    assert "g-values" in shown.err
    assert "Next: tracer report model.nc" in shown.err
    assert json.loads(Path("fit.json").read_text(encoding="utf-8"))["title"] == "Tail of Harrow"
    assert Path("fit.png").read_bytes().startswith(b"\x89PNG")
    assert not [path for path in folder.iterdir() if path.name.startswith(".")]
    assert ending_of("model.nc", "seen.toml", "-o", "fit.json") == 2
    assert "fit.json: exists; --overwrite replaces it" in capsys.readouterr().err
    assert ending_of("model.nc", "seen.toml") == 0
    assert "Next: tracer compare model.nc seen.toml -o seen.png" in capsys.readouterr().err


@pytest.mark.parametrize("factor", [1e-3, 1e3, 1e4])
def test_unit_slip_is_noticed_and_said(folder, products, capsys, factor):
    write_profile(products[1], factor)
    assert ending_of("model.nc", "seen.toml") == 0
    shown = capsys.readouterr().out
    assert "warning: is the unit of the values right?" in shown
    assert ("rayleigh and kilorayleigh mixed up" in shown) == (factor != 1e4)


def test_right_unit_gets_no_warning(folder, capsys):
    assert ending_of("model.nc", "seen.toml") == 0
    assert "unit" not in capsys.readouterr().out.partition("chi-square")[2]


def test_bad_observations_end_with_2_one_line_and_no_file(folder, capsys):
    text = Path("seen.csv").read_text(encoding="utf-8")
    row = text.splitlines()[3]
    for old, new, words, message in (
        (row, row.rpartition(",")[0] + ",-1", [], "row 3, column sigma_kR: -1 is not allowed"),
        (row, "-9,1,1", [], "row 3, column downtail_radii: -9 turns back"),
        (row, "-0.5,nan,1", [], "row 3, column brightness_kR: nan is not allowed"),
        ("brightness_kR", "brightness", [], "column brightness_kR: missing"),
        (text.splitlines()[-1], "60,1,1", [], "model.nc: image tail does not hold the profile"),
        ("", "", ["-o", "seen.csv", "--overwrite"], "seen.csv: is read by this command"),
        ("", "", ["-o", "fit.txt"], '--output: "fit.txt" has none of the endings .json, .png, .pdf, .svg'),
    ):
        Path("seen.csv").write_text(text.replace(old, new, 1) if old else text, encoding="utf-8")
        before = sorted(path.name for path in folder.iterdir())
        assert ending_of("model.nc", "seen.toml", *words) == 2
        error = capsys.readouterr().err
        assert message in error, error
        assert error.count("\n") == 1
        assert sorted(path.name for path in folder.iterdir()) == before


def test_bad_arguments_are_named(folder, products, capsys):
    save_product(products[1], "other.nc")
    for words, message in (
        (["seen.toml"], "seen.toml: alone is too little"),
        (["seen.toml", "model.nc"], "seen.toml: is no product"),
        (["model.nc", "model.nc", "seen.toml"], "model.nc: a product is named twice"),
        (["none.nc", "seen.toml"], "none.nc: no such file"),
    ):
        assert ending_of(*words) == 2
        assert message in capsys.readouterr().err
    fitted = '[[fit.release]]\nname = "NAME"\ntemperature = ["1500 K", "RANGE"]\n'
    for name, high, product, message in (
        (
            "vapor",
            "9000 K",
            "model.nc",
            '"vapor" is no release of the products; did you mean "vapour"?',
        ),
        ("vapour", "9e6 K", "model.nc", "seen.toml: fit.release[1]: maxwell-flux with temperature"),
        ("vapour", "9000 K", "other.nc", "other.nc: has no brightness_response_tail"),
    ):
        text = OBSERVATION + fitted.replace("NAME", name).replace("RANGE", high)
        Path("seen.toml").write_text(text, encoding="utf-8")
        assert ending_of(product, "seen.toml") == 2
        assert message in capsys.readouterr().err


def test_products_are_pooled_where_body_sun_and_gas_agree(folder, products, capsys):
    save_product(products[1], "other.nc")
    assert ending_of("model.nc", "other.nc", "seen.toml", "--json") == 0
    found = json.loads(capsys.readouterr().out)
    assert sorted(found["rates"]) == [
        "desorption (model.nc)",
        "desorption (other.nc)",
        "vapour (model.nc)",
        "vapour (other.nc)",
    ]
    assert any("cannot be told apart" in words or "not needed" in words for words in found["statements"])
    assert not any("same seed" in words for words in found["warnings"])
    elsewhere = products[1].copy()
    elsewhere.attrs["run_file"] = elsewhere.attrs["run_file"].replace('"0.35 au"', '"0.45 au"')
    save_product(elsewhere, "far.nc")
    assert ending_of("model.nc", "far.nc", "seen.toml") == 2
    assert "far.nc: cannot be pooled with model.nc: they differ in sun.distance" in capsys.readouterr().err


def test_known_background_is_added_to_the_model(folder, capsys):
    assert ending_of("model.nc", "seen.toml", "--json") == 0
    plain = json.loads(capsys.readouterr().out)
    head, *rows = Path("seen.csv").read_text(encoding="utf-8").splitlines()
    raised = [f"{x},{float(value) + 40.0!r},{sigma}" for x, value, sigma in (row.split(",") for row in rows)]
    Path("seen.csv").write_text("\n".join([head, *raised]) + "\n", encoding="utf-8")
    Path("seen.toml").write_text(OBSERVATION + '[background]\nlevel = "40000 R"\n', encoding="utf-8")
    assert ending_of("model.nc", "seen.toml", "--json") == 0
    found = json.loads(capsys.readouterr().out)
    for name in RATES:
        assert found["rates"][name]["best"] == pytest.approx(plain["rates"][name]["best"], rel=1e-6)
    assert found["points"]["background"] == pytest.approx([40.0] * len(POSITIONS))
    assert found["background"] is None


def test_law_in_a_fit_is_the_one_that_evaluate_law_gives(folder, products, capsys):
    """A response has two orders in each bin; without the second, points here are off by per cents."""
    law = {"law": "sigmund-thompson", "binding_energy": "2 eV", "cutoff_energy": "100 eV"}
    keys = 'law = "sigmund-thompson"\nbinding_energy = "2 eV"\ncutoff_energy = "100 eV"\nrate = "5e23 s-1"\n'
    Path("seen.toml").write_text(OBSERVATION + f'[[fit.release]]\nname = "vapour"\n{keys}', encoding="utf-8")
    assert ending_of("model.nc", "seen.toml", "--json") == 0
    found = json.loads(capsys.readouterr().out)
    image = tracer.evaluate_law(products[0], "vapour", law).brightness_tail.sel(line="na_d2").values
    edges = tuple(
        np.append(
            products[0][f"tail_{axis}_bounds"].values[:, 0], products[0][f"tail_{axis}_bounds"].values[-1, 1]
        )
        for axis in ("vertical", "horizontal")
    )
    track = Track(-POSITIONS * RADIUS, np.zeros(len(POSITIONS)), np.pi)
    weights = smearing(edges, track, Aperture(0.5 * RADIUS, RADIUS, np.pi), Spread(0.6 * RADIUS, None))
    np.testing.assert_allclose(found["points"]["parts"]["vapour"], weights @ image.ravel() / 1e3, rtol=1e-6)


def test_pooled_products_of_one_seed_are_named(folder, products, capsys):
    save_product(products[0], "again.nc")
    assert ending_of("model.nc", "again.nc", "seen.toml") == 0
    assert "warning: again.nc and model.nc have the same seed" in capsys.readouterr().out


def test_view_without_an_image_is_seen_through_the_grid(folder, capsys):
    lines = Path("seen.csv").read_text(encoding="utf-8").splitlines()
    Path("seen.csv").write_text("\n".join(lines[:12]) + "\n", encoding="utf-8")
    text = OBSERVATION.replace('look_from = "north"', 'phase_angle = "60 deg"\nside = "dawn"')
    Path("seen.toml").write_text(text, encoding="utf-8")
    assert ending_of("model.nc", "seen.toml") == 0
    assert (
        "at phase angle 60 deg on the dawn side, by lines of sight through its grid"
        in capsys.readouterr().out
    )
    fitted = '[[fit.release]]\nname = "vapour"\ntemperature = ["1500 K", "9000 K"]\n'
    Path("seen.toml").write_text(text + fitted, encoding="utf-8")
    assert ending_of("model.nc", "seen.toml") == 2
    assert "law parameters are fitted from the responses of an image" in capsys.readouterr().err


def test_python_gives_what_the_command_prints(folder, capsys):
    with tracer.open_product("model.nc") as ds:
        found = tracer.compare(ds, tracer.load_observation("seen.toml"))
    assert ending_of("model.nc", "seen.toml", "--json") == 0
    printed = json.loads(capsys.readouterr().out)
    assert found.rates["vapour"].best == pytest.approx(printed["rates"]["vapour"]["best"], rel=1e-12)
