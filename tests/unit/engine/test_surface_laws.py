"""The ground's laws from the run file to kernels, `check`, references and the product."""

import numpy as np
import pytest
import xarray as xr

from tracer.engine.preview import preview
from tracer.engine.references import HEAT_CONDUCTION, MOON_TEMPERATURE, scene_references
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import Scene, build_scene
from tracer.engine.surface_preview import SurfacePreview, preview_surface
from tracer.engine.surface_temperature import synodic_rate
from tracer.engine.tracing import run
from tracer.errors import InputError
from tracer.kernels.temperature import CONDUCTION, temperature
from tracer.physics.conduction import Ground, conduction_map
from tracer.tally.axes import direction

AU = 1.495978707e11
DAY = 86400.0

RUN = """
title = "Sodium over Harrow, lit ground"
body = { name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2", rotation_period = "60 d" }
sun = { distance = "0.35 au", tide = false }
gas = { species = "unlit", mass = "23 u" }
domain = { outer_radius = "5 radii", age_limit = "1 d" }
grid = { altitude = { cells = 2, top = "1 radii" }, latitude_cells = 6, local_time_cells = 8 }
ensemble = { particles_per_batch = 20, batches = 2 }
[surface]
sticking = 1.0
[[release]]
name = "ground"
rate = "1e20 s-1"
speed = { law = "maxwell-flux", temperature = "surface" }
"""
CONDUCTING = '{ law = "conduction", thermal_inertia = "50 J m-2 K-1 s-1/2", albedo = 0.1, emissivity = 0.9 }'
LAWS = {
    "equilibrium": '{ law = "equilibrium", albedo = 0.1, night = "95 K" }',
    "hurley-2015": '"hurley-2015"',
    "conduction": CONDUCTING,
    "map": '{ law = "map", file = "ground.nc", variable = "warmth" }',
}


def scene(law: str, *changes: str) -> Scene:
    return build_scene(parse_run(RUN, "run file", [f"surface.temperature={law}", *changes]))


def figures(law: str, *changes: str) -> SurfacePreview:
    spec = parse_run(RUN, "run file", [f"surface.temperature={law}", *changes])
    return preview_surface(spec, build_scene(spec))


def refusal(law: str, *changes: str) -> str:
    with pytest.raises(InputError) as caught:
        scene(law, *changes)
    assert len(str(caught.value).splitlines()) == 1
    return str(caught.value)


def warm_map() -> xr.Dataset:
    latitude, local_time = np.arange(-75.0, 90.0, 30.0), np.arange(1.5, 24.0, 3.0)
    values = 200.0 + latitude[:, np.newaxis] + local_time
    return xr.Dataset(
        {"warmth": (("latitude", "local_time"), values, {"units": "K"})},
        coords={"latitude": latitude, "local_time": local_time},
    )


@pytest.mark.parametrize("name", LAWS)
def test_product_holds_the_laws_temperature_at_the_middle_of_each_cell(name, tmp_path):
    warm_map().to_netcdf(tmp_path / "ground.nc")
    spec = parse_run(RUN, tmp_path / "run.toml", [f"surface.temperature={LAWS[name]}"])
    product = run(spec, workers=1)
    law = build_scene(spec).surface_temperature
    assert law is not None
    for latitude in product.latitude.values:
        for hour in product.local_time.values:
            expected = temperature(law, *direction(latitude, hour))
            found = product.surface_temperature.sel(latitude=latitude, local_time=hour)
            assert float(found) == expected
    if name == "map":
        np.testing.assert_allclose(product.surface_temperature, warm_map().warmth, rtol=1e-12)
    assert (MOON_TEMPERATURE in product.attrs["references"]) == (name == "hurley-2015")
    assert (HEAT_CONDUCTION in product.attrs["references"]) == (name == "conduction")


def test_equilibrium_takes_the_distance_of_the_sun():
    # [(1 - A) S/(eps sigma d^2)]^(1/4) by hand: 0.9 x 1361/(0.95 x 5.670374e-8 x 0.35^2) = 1.85619e11 K^4.
    law = scene(LAWS["equilibrium"]).surface_temperature
    assert temperature(law, 1.0, 0.0, 0.0) == pytest.approx(1.85619e11**0.25, rel=1e-5)
    farther = scene(LAWS["equilibrium"], "sun.distance=1.4 au").surface_temperature
    assert temperature(farther, 1.0, 0.0, 0.0) == pytest.approx(0.5 * 1.85619e11**0.25, rel=1e-5)


@pytest.mark.parametrize(
    ("changes", "distance_au", "rate"),
    [
        # A circle at the Sun's distance where there is no orbit: Kepler's third law in years and au.
        ((), 0.35, 1.0 / 60.0 - 1.0 / (365.25690 * 0.35**1.5)),
        # The orbit's mean motion, at the distance of its mean sunlight: 1/(a^2 sqrt(1 - e^2)), two-body motion.
        (
            (
                'body.orbit={ semi_major_axis = "0.42 au", eccentricity = 0.18 }',
                'sun={ true_anomaly = "0 deg" }',
            ),
            0.42 * (1.0 - 0.18**2) ** 0.25,
            1.0 / 60.0 - 1.0 / (365.25690 * 0.42**1.5),
        ),
        # Slower than its orbit: the Sun moves the other way.
        (("body.rotation_period=200 d",), 0.35, 1.0 / 200.0 - 1.0 / (365.25690 * 0.35**1.5)),
        (("body.rotation_period=-60 d",), 0.35, -1.0 / 60.0 - 1.0 / (365.25690 * 0.35**1.5)),
    ],
)
def test_conduction_takes_the_mean_rate_under_the_sun_and_its_mean_distance(changes, distance_au, rate):
    found = scene(CONDUCTING, *changes)
    assert found.surface_temperature.law == CONDUCTION
    assert synodic_rate(found.body, found.sun) == pytest.approx(2.0 * np.pi * rate / DAY, rel=1e-6)
    expected = conduction_map(Ground(50.0, 0.1, 0.9), distance_au * AU, 2.0 * np.pi * rate / DAY)
    np.testing.assert_allclose(found.surface_temperature.table.values, expected.values, rtol=2e-5)


def test_conduction_may_be_lit_at_another_distance():
    near = scene(CONDUCTING).surface_temperature.table.values
    law = CONDUCTING.replace("albedo", 'distance = "0.7 au", albedo')
    far = scene(law).surface_temperature.table.values
    assert far.max() == pytest.approx(near.max() / np.sqrt(2.0), rel=0.01)


def test_thermal_inertia_is_the_root_of_conductivity_density_and_heat_capacity():
    parts = 'conductivity = "0.25 W m-1 K-1", density = "2 g cm-3", heat_capacity = "500 J kg-1 K-1"'
    law = CONDUCTING.replace('thermal_inertia = "50 J m-2 K-1 s-1/2"', parts)
    expected = CONDUCTING.replace("50 J", "500 J")
    np.testing.assert_array_equal(
        scene(law).surface_temperature.table.values, scene(expected).surface_temperature.table.values
    )


@pytest.mark.parametrize(
    ("law", "changes", "message"),
    [
        (
            '{ law = "conduction", albedo = 0.1 }',
            (),
            "surface.temperature.thermal_inertia: missing; either this or conductivity, density and heat_capacity are "
            'needed; write for example "50 J m-2 K-1 s-1/2"',
        ),
        (
            CONDUCTING.replace("albedo", 'density = "2 g cm-3", albedo'),
            (),
            'surface.temperature.density: "2 g cm-3" stands beside thermal_inertia "50 J m-2 K-1 s-1/2"; must be one '
            "of the two",
        ),
        (
            '{ law = "conduction", albedo = 0.1, density = "2 g cm-3", heat_capacity = "500 J kg-1 K-1" }',
            (),
            "surface.temperature.conductivity: missing; needed beside density and heat_capacity, or thermal_inertia in "
            "their place",
        ),
        (
            CONDUCTING.replace("50 J m-2 K-1 s-1/2", "50 W m-1 K-1"),
            (),
            'surface.temperature.thermal_inertia: "50 W m-1 K-1": "W m-1 K-1" is not a unit of thermal inertia; write '
            'for example "50 J m-2 K-1 s-1/2"',
        ),
        (
            CONDUCTING.replace("50 J", "0 J"),
            (),
            'surface.temperature.thermal_inertia: "0 J m-2 K-1 s-1/2" is out of range; must be above 0 J m-2 K-1 s-1/2',
        ),
        (
            CONDUCTING.replace("albedo = 0.1", "albedo = 1.0"),
            (),
            "surface.temperature.albedo: 1.0 is out of range; must be a number at least 0 and below 1",
        ),
        (
            CONDUCTING,
            ('body={ name = "Harrow", radius = "1800 km", gm = "9500 km3 s-2" }',),
            'surface.temperature: "conduction" needs body.rotation_period, for example "60 d": the ground must turn',
        ),
        (
            CONDUCTING,
            (
                "body.rotation_period=365.2568983 d",
                'body.orbit={ semi_major_axis = "1 au", eccentricity = 0.0 }',
                'sun={ true_anomaly = "0 deg" }',
            ),
            'surface.temperature: "conduction" needs ground that turns under the Sun; must be for example '
            '"equilibrium"',
        ),
    ],
)
def test_conduction_that_cannot_be(law, changes, message):
    found = refusal(law, *changes)
    assert found.startswith(f"run file: {message}")


def test_conduction_without_a_sun():
    text = RUN.replace('sun = { distance = "0.35 au", tide = false }', "")
    with pytest.raises(InputError) as caught:
        parse_run(text, "run file", [f"surface.temperature={CONDUCTING}"])
    assert str(caught.value) == (
        'run file: surface.temperature: "conduction" needs [sun]; without it there is no distance from the Sun'
    )


def test_check_shows_the_range_of_temperature_and_sticking():
    sticking = 'surface.sticking={ law = "exponential", at = "250 K", value = 0.5, e_folding = "272.8 K" }'
    found = figures('{ law = "quarter-power", subsolar = "500 K", night = "250 K" }', sticking)
    assert found.temperature_law == "quarter-power"
    assert (found.noon_temperature, found.midnight_temperature) == (500.0, 250.0)
    assert (found.lowest_temperature, found.highest_temperature) == (250.0, 500.0)
    assert found.lowest_sticking == pytest.approx(0.2, abs=1e-4)
    assert found.highest_sticking == 0.5
    # 1/(1/60 d - 1/75.63 d).
    assert found.solar_day == pytest.approx(290.3 * DAY, rel=1e-3)


def test_check_shows_the_extremes_of_maps_and_of_the_moons_fit(tmp_path):
    moon = figures(LAWS["hurley-2015"])
    assert (moon.noon_temperature, moon.highest_temperature) == (392.0, 392.0)
    assert moon.midnight_temperature == pytest.approx(101.83, abs=0.01)
    assert 59.0 < moon.lowest_temperature < 61.0
    warm_map().to_netcdf(tmp_path / "ground.nc")
    spec = parse_run(RUN, tmp_path / "run.toml", [f"surface.temperature={LAWS['map']}"])
    found = preview_surface(spec, build_scene(spec))
    assert found.lowest_temperature == float(warm_map().warmth.min())
    assert found.highest_temperature == float(warm_map().warmth.max())


def test_check_says_that_the_moons_fit_is_the_moons():
    spec = parse_run(RUN, "run file", ['surface.temperature="hurley-2015"'])
    notes = preview(spec, build_scene(spec), 1).notes
    assert "the temperature law hurley-2015 was fitted to the Moon, not to Harrow" in notes


def test_ground_without_temperature_shows_its_sticking_alone():
    spec = parse_run(RUN, "run file", ["release[1].speed.temperature=300 K"])
    found = preview_surface(spec, build_scene(spec))
    assert found.temperature_law is found.noon_temperature is found.lowest_temperature is None
    assert (found.lowest_sticking, found.highest_sticking) == (1.0, 1.0)


def test_references_of_a_scene_without_a_ground_temperature():
    assert not {MOON_TEMPERATURE, HEAT_CONDUCTION} & set(
        scene_references(build_scene(parse_run(RUN, "run file", ["release[1].speed.temperature=300 K"])))
    )


def test_release_by_a_map_gives_the_maps_flux(tmp_path):
    ds = warm_map().rename(warmth="flux")
    ds["flux"] = ((ds.flux - ds.flux.min()) ** 2).assign_attrs(units="kg m-2")
    ds.to_netcdf(tmp_path / "flux.nc")
    changes = [
        'release[1].place={ law = "map", file = "flux.nc", variable = "flux" }',
        "release[1].speed.temperature=300 K",
        "ensemble.particles_per_batch=4000",
        "ensemble.batches=10",
    ]
    product = run(parse_run(RUN, tmp_path / "run.toml", changes), workers=1)
    area = product.cell_area
    total = (ds.flux * area).sum()
    expected = 1e20 * ds.flux / total
    found = product.release_flux.isel(release=0)
    # Counts of 40,000 atoms in 48 cells: 4.5 Poisson errors, false alarm 3e-4.
    error = np.sqrt(expected * 1e20 / 40_000 / area)
    assert float(np.abs((found - expected) / error.where(error > 0.0)).max()) < 4.5
    assert float(found.where(expected == 0.0, 0.0).max()) == 0.0
    assert float((found * area).sum()) == pytest.approx(1e20, rel=1e-12)


def test_release_map_that_is_nothing(tmp_path):
    ds = warm_map()
    ds["warmth"] = 0.0 * ds.warmth
    ds.to_netcdf(tmp_path / "flux.nc")
    place = 'release[1].place={ law = "map", file = "flux.nc", variable = "warmth" }'
    spec = parse_run(RUN, tmp_path / "run.toml", [place, "release[1].speed.temperature=300 K"])
    with pytest.raises(InputError) as caught:
        build_scene(spec)
    assert str(caught.value) == (
        f'{tmp_path / "run.toml"}: release[1].place.variable: "warmth" of flux.nc: is 0 everywhere; must be above 0 '
        "somewhere"
    )
