"""The dark lane on a sodium tail's axis: where atoms fly in the umbra they neither shine nor are seen.

Behind the umbra's tip the Sun is a ring about the body, which hides less of it with the square of the distance: the
lane closes.
"""

import numpy as np
import pytest

from tracer.catalogue.load import bodies, hosts
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene

RUN = """
title = "lane"
[body]
name = "Mercury"
[sun]
true_anomaly = "40 deg"
motion = "{motion}"
shadow = "{shadow}"
[gas]
species = "Na"
[[release]]
name = "vapour"
rate = "1e24 s-1"
speed = {{ law = "maxwell-flux", temperature = "4000 K" }}
[surface]
sticking = 1.0
[domain]
outer_radius = "220 radii"
age_limit = "20 d"
[grid]
altitude = {{ cells = 1 }}
latitude_cells = 1
local_time_cells = 1
[[image]]
name = "north"
look_from = "north"
horizontal = ["-200 radii", "0 radii"]
vertical = ["-2.5 radii", "2.5 radii"]
pixels = [20, 5]
[ensemble]
particles_per_batch = {particles}
batches = 10
replicates = 10
"""


def on_axis(ds, band, per_atom):
    """Return mean and standard error of the brightness within 0.5 R of the axis over that 1.5 to 2.5 R beside it.

    `band` is the distance behind the body in radii, from and to; `per_atom` divides by the columns.
    """
    downtail = -ds.north_horizontal / ds.attrs["body_radius"]
    wanted = (downtail > band[0]) & (downtail < band[1])
    light = ds.brightness_north_replicates.sum("line").isel(release=0, north_horizontal=wanted.values)
    atoms = ds.column_north_replicates.isel(release=0, north_horizontal=wanted.values)
    light, atoms = light.sum("north_horizontal").values, atoms.sum("north_horizontal").values
    ratio = light[:, 2] / (0.5 * (light[:, 0] + light[:, 4]))
    if per_atom:
        ratio = (light[:, 2] / atoms[:, 2]) / ((light[:, 0] + light[:, 4]) / (atoms[:, 0] + atoms[:, 4]))
    return ratio.mean(), ratio.std(ddof=1) / np.sqrt(len(ratio))


def shadowless(traced):
    return traced(RUN.format(motion="stationary", shadow="none", particles=4_000))


def test_the_tip_of_the_umbra_lies_between_the_bands():
    text = RUN.format(motion="stationary", shadow="penumbra", particles=1)
    distance = build_scene(parse_run(text, "run")).sun.station.distance
    radius = bodies()["Mercury"].radius
    # R d/(R_sun - R) behind the centre: similar triangles.
    tip = distance / (hosts()["Sun"].radius - radius)
    assert 60.0 < tip < 80.0


@pytest.mark.parametrize("motion", ["stationary", "moving"])
def test_lane_is_dark_near_the_body_and_closes_behind_the_umbras_tip(traced, motion):
    # A moving body has fewer samples an atom.
    particles = {"stationary": 4_000, "moving": 8_000}[motion]
    ds = traced(RUN.format(motion=motion, shadow="penumbra", particles=particles))
    # The image itself: the core of the tail, bent in by gravity, is what would shine brightest.
    bright, bright_error = on_axis(shadowless(traced), (10.0, 50.0), per_atom=False)
    mean, error = on_axis(ds, (10.0, 50.0), per_atom=False)
    assert mean + 3.0 * error < 0.85 * (bright - 3.0 * bright_error)
    for band, darkest in (((10.0, 30.0), 0.75), ((30.0, 50.0), 0.85)):
        mean, error = on_axis(ds, band, per_atom=True)
        assert mean + 3.0 * error < darkest
    mean, error = on_axis(ds, (120.0, 200.0), per_atom=True)
    assert mean - 3.0 * error > 0.94


def test_without_shadow_there_is_no_lane(traced):
    ds = shadowless(traced)
    mean, error = on_axis(ds, (10.0, 50.0), per_atom=False)
    assert mean - 3.0 * error > 1.0
    mean, error = on_axis(ds, (10.0, 50.0), per_atom=True)
    assert mean == pytest.approx(1.0, abs=0.02 + 3.0 * error)
