"""What atoms scatter, seen in cells and images, and the body's shadow over it."""

import math

import numpy as np
import pytest

AU = 1.495978707e11
SUN_RADIUS = 6.957e8

RUN = """
title = "emission"
[body]
name = "Ball"
radius = "1000 km"
gm = "1500 km3 s-2"
[sun]
distance = "0.3 au"
shadow = "{shadow}"
[gas]
species = "shiner"
mass = "23 u"
photoionization_rate = "1e-5 s-1"
radiation_acceleration = "none"
[[gas.line]]
name = "weak"
wavelength = "400 nm"
g = "0.2 s-1"
[[gas.line]]
name = "strong"
wavelength = "600 nm"
g = "3 s-1"
[[release]]
name = "vent"
rate = "1e24 s-1"
speed = {{ law = "maxwell-flux", temperature = "1500 K" }}
[surface]
sticking = 1.0
[domain]
outer_radius = "10 radii"
[grid]
altitude = {{ first_cell = "0.2 radii", top = "2 radii", cells = 5 }}
latitude_cells = 6
local_time_cells = 24
[[image]]
name = "dusk"
look_from = "dusk"
horizontal = ["-4 radii", "4 radii"]
vertical = ["-4 radii", "4 radii"]
pixels = [16, 16]
[ensemble]
particles_per_batch = 2_000
batches = 10
replicates = 0
"""
G = {"weak": 0.2, "strong": 3.0}
DILUTION = (1.0 / 0.3) ** 2


def emission_run(shadow):
    return RUN.format(shadow=shadow)


def test_brightness_without_shadow_is_g_times_column(traced):
    ds = traced(emission_run("none"))
    column, density = ds.column_dusk.values, ds.number_density.values
    assert np.count_nonzero(column) > 200
    for line, g in G.items():
        # In rayleigh, 1e10 photons m-2 s-1. Distances from the Sun differ by 10 R, 2.2e-4; the light by twice that.
        brightness = ds.brightness_dusk.sel(line=line).values
        np.testing.assert_allclose(brightness, g * DILUTION * column / 1e10, rtol=1e-3)
        emission = ds.emission_rate.sel(line=line).values
        np.testing.assert_allclose(emission, g * DILUTION * density, rtol=1e-3)


def test_ionisation_without_shadow_is_rate_times_density(traced):
    ds = traced(emission_run("none"))
    np.testing.assert_allclose(
        ds.ionization_rate.values, 1e-5 * DILUTION * ds.number_density.values, rtol=1e-3
    )


def behind_the_body(ds):
    """Which cells (altitude, latitude, local_time) lie wholly within the umbra near the body."""
    latitude = np.abs(ds.latitude_bounds).max("bounds")
    hours = np.minimum(ds.local_time_bounds, 24.0 - ds.local_time_bounds).max("bounds")
    cosine = np.cos(np.radians(latitude.values))[:, None] * np.cos(hours.values * math.pi / 12.0)[None, :]
    angle = np.arccos(cosine)
    r = 1e6 + ds.altitude_bounds.values[:, 1]
    # The umbra narrows by the Sun's angular radius, 0.9 degrees here.
    narrowing = math.tan(math.asin(SUN_RADIUS / (0.3 * AU)))
    reach = 1e6 - r[:, None, None] * narrowing
    return (r[:, None, None] * np.sin(angle) < reach) & (angle < math.pi / 2.0)


@pytest.mark.parametrize("shadow", ["cylinder", "penumbra"])
def test_nothing_shines_and_nothing_is_ionised_behind_the_body(traced, shadow):
    ds = traced(emission_run(shadow)).isel(release=0)
    dark = behind_the_body(ds) & (ds.number_density.values > 0.0)
    assert np.count_nonzero(dark) > 20
    assert np.all(ds.ionization_rate.values[dark] == 0.0)
    assert np.all(ds.emission_rate.values[:, dark] == 0.0)


def test_without_shadow_the_gas_behind_the_body_does_shine(traced):
    ds = traced(emission_run("none")).isel(release=0)
    dark = behind_the_body(ds) & (ds.number_density.values > 0.0)
    assert np.all(ds.ionization_rate.values[dark] > 0.0)
    assert np.all(ds.emission_rate.values[:, dark] > 0.0)


@pytest.mark.parametrize("shadow", ["cylinder", "penumbra"])
def test_shadow_leaves_the_day_side_in_full_light(traced, shadow):
    day = traced(emission_run(shadow)).sel(local_time=slice(6.0, 18.0), release="vent")
    strong = day.emission_rate.sel(line="strong").values
    np.testing.assert_allclose(strong, 3.0 * DILUTION * day.number_density.values, rtol=1e-3)


JET = """
title = "jet"
[body]
name = "Pebble"
radius = "10 km"
gm = "0 km3 s-2"
[sun]
distance = "{distance} au"
radial_velocity = "5 km/s"
tide = false
shadow = "{shadow}"
[gas]
species = "shiner"
mass = "23 u"
photoionization_rate = "1e-6 s-1"
radiation_acceleration = "none"
[[gas.line]]
name = "line"
wavelength = "500 nm"
g = {g}
[[release]]
name = "jet"
rate = "1e20 s-1"
speed = {{ law = "single", speed = "10 km/s" }}
direction = {{ law = "normal" }}
place = {{ law = "patch", latitude = "0 deg", local_time = {hour}, radius = "1 m" }}
[surface]
sticking = 1.0
[domain]
outer_radius = "45 radii"
[grid]
altitude = {{ first_cell = "1 radii", top = "40 radii", cells = 40 }}
latitude_cells = 1
local_time_cells = 1
[ensemble]
particles_per_batch = 2_000
batches = 10
replicates = 0
"""
ATOMS = 2_000 * 10


def photons_per_atom(ds):
    """(altitude,) photons that an atom scatters each second."""
    return (ds.emission_rate / ds.number_density).isel(line=0, release=0, latitude=0, local_time=0).values


def annular_light(r):
    """Light at `r` [m] behind the centre of the pebble at 0.05 au, relative to that at 1 au, behind the umbra's tip."""
    d = 0.05 * AU
    body, sun = math.asin(1e4 / r), math.asin(SUN_RADIUS / (d + r))
    return 0.0 if body >= sun else (1.0 - (body / sun) ** 2) * (AU / (d + r)) ** 2


def test_a_jet_down_the_shadows_axis_shines_again_behind_the_umbras_tip(traced):
    # At 0.05 au the Sun's angular radius is 5.3 degrees: the umbra ends 10.7 radii behind the pebble.
    ds = traced(JET.format(distance=0.05, shadow="penumbra", g='"2 s-1"', hour="0.0"))
    found = photons_per_atom(ds)
    edges = 1e4 + ds.altitude_bounds.values
    tip = 1e4 / (SUN_RADIUS - 1e4) * 0.05 * AU
    assert np.all(found[edges[:, 1] < 0.99 * tip] == 0.0)
    beyond = edges[:, 0] > 1.05 * tip
    assert np.count_nonzero(beyond) > 10
    expected = np.array([2.0 * np.mean([annular_light(r) for r in np.linspace(*pair, 50)]) for pair in edges])
    # N samples lie evenly in a cell, over which the light rises nearly linearly: their mean scatters by the rise over
    # sqrt(12 N). A step is sampled once for each whole quarter of a radius, 16 times at the most: up to 8 radii a step,
    # every atom twice a cell or oftener. Four of these: false alarm 6e-5 a cell.
    samples = 2.0 * ATOMS
    rise = 2.0 * np.array([annular_light(high) - annular_light(low) for low, high in edges])
    allowed = 4.0 * rise / math.sqrt(12.0 * samples) + 1e-3 * expected
    assert np.all(np.abs(found - expected)[beyond] < allowed[beyond])
    assert np.all(allowed[beyond] < 0.02 * expected[beyond])
    ions = (ds.ionization_rate / ds.number_density).values.ravel()
    np.testing.assert_allclose(ions, 1e-6 * found / 2.0, rtol=1e-9)


def test_a_cylinder_has_no_tip(traced):
    ds = traced(JET.format(distance=0.05, shadow="cylinder", g='"2 s-1"', hour="0.0"))
    assert np.all(photons_per_atom(ds) == 0.0)


@pytest.mark.parametrize(("hour", "velocity"), [(12.0, 5.0 - 10.0), (0.0, 5.0 + 10.0), (6.0, 5.0)])
def test_atoms_shine_at_their_own_velocity_from_the_sun(tmp_path, traced, hour, velocity):
    # The body recedes by 5 km/s, the jet goes at 10 km/s towards the Sun, away from it, or across.
    table = tmp_path / "g.csv"
    table.write_text("-20,1\n20,5\n", encoding="utf-8")
    g = f'{{ file = "{table}" }}'
    ds = traced(JET.format(distance=0.5, shadow="none", g=g, hour=hour))
    expected = (1.0 + 4.0 * (velocity + 20.0) / 40.0) * 4.0
    np.testing.assert_allclose(photons_per_atom(ds), expected, rtol=2e-4)
    assert ds.attrs["share_beyond_line_tables"] == 0.0
