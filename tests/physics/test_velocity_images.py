"""Images resolved by velocity: signs, the turning frame, and a free Maxwellian flux against its moments."""

from math import pi, sqrt

import numpy as np
import pytest
from scipy.integrate import quad_vec

from tracer.constants import ASTRONOMICAL_UNIT, ATOMIC_MASS, BOLTZMANN, GM_SUN

RADIUS = 1e5

HEAD = """
title = "velocities"
[body]
name = "Pebble"
radius = "100 km"
gm = "0 km3 s-2"
{orbit}
{sun}
[gas]
species = "parent"
mass = "18 u"
{gas}
[[release]]
name = "source"
rate = "1e20 s-1"
{release}
[surface]
sticking = 1.0
[domain]
outer_radius = "{outer} radii"
[grid]
altitude = {{ first_cell = "40 km", top = "9 radii", cells = 1 }}
latitude_cells = 1
local_time_cells = 1
{images}
[ensemble]
particles_per_batch = {particles}
batches = {batches}
replicates = {batches}
"""

IMAGE = """
[[image]]
name = "{name}"
look_from = {look_from}
horizontal = ["{left} radii", "{right} radii"]
vertical = ["{low} radii", "{high} radii"]
pixels = [{columns}, {rows}]
velocity = {{ from = "-4 km/s", to = "4 km/s", bins = 32 }}
"""

JET = """speed = { law = "single", speed = "1 km/s" }
direction = { law = "normal" }
place = { law = "patch", latitude = "0 deg", local_time = 12.0, radius = "10 m" }
"""


def run_text(images: str, **parts) -> str:
    given = {
        "orbit": "",
        "sun": "",
        "gas": "",
        "release": JET,
        "outer": 40,
        "particles": 40,
        "batches": 4,
        **parts,
    }
    return HEAD.format(images=images, **given)


def picture(name: str, look_from: str, **ends) -> str:
    given = {"left": -50, "right": 50, "low": -50, "high": 50, "columns": 1, "rows": 1, **ends}
    return IMAGE.format(name=name, look_from=look_from, **given)


# A jet from noon to the Sun at 1000 m/s, by hand: -n.v for the unit vector n from the body to the viewer.
BY_HAND = {
    "sun": ('"sun"', -1000.0),
    "north": ('"north"', 0.0),
    "dawn": ('"dawn"', 0.0),
    "evening": ('{ latitude = "0 deg", local_time = 20.0 }', 500.0),
    "forenoon": ('{ latitude = "0 deg", local_time = 8.0 }', -500.0),
    "from above": ('{ latitude = "30 deg", local_time = 12.0 }', -1000.0 * sqrt(0.75)),
}


@pytest.fixture(scope="module")
def jet(traced):
    return traced(run_text("".join(picture(name, look) for name, (look, _) in BY_HAND.items())))


@pytest.mark.parametrize("name", BY_HAND)
def test_what_flies_away_from_the_viewer_counts_positive(jet, name):
    expected, stem = BY_HAND[name][1], name.replace(" ", "_")
    assert jet[f"mean_velocity_{stem}"].item() == pytest.approx(expected, abs=0.2)
    # The patch is 10 m wide on a globe of 100 km: directions differ by 1e-4 of 1000 m/s.
    assert jet[f"velocity_width_{stem}"].item() < 0.2
    bins = jet[f"column_by_velocity_{stem}"].squeeze()
    bounds = jet[f"{stem}_velocity_bounds"].values
    holding = (bounds[:, 0] <= expected + 0.2) & (bounds[:, 1] >= expected - 0.2)
    assert bins.values[~holding].sum() == 0.0
    assert bins.sum().item() == pytest.approx(jet[f"column_{stem}"].item(), rel=1e-12)


def test_hidden_atoms_have_no_velocity(traced):
    ds = traced(run_text(picture("midnight", '"midnight"', left=-0.9, right=0.9, low=-0.9, high=0.9)))
    assert ds.column_midnight.item() == 0.0
    assert np.isnan(ds.mean_velocity_midnight.item())
    assert np.isnan(ds.velocity_width_midnight.item())


DISTANCE_AU = 0.05
OMEGA = sqrt(GM_SUN / (DISTANCE_AU * ASTRONOMICAL_UNIT) ** 3)
SUNLIT_LOSS = 'photoionization_rate = "1e-12 s-1"\nradiation_acceleration = "none"\n'
CIRCLE = 'orbit = { semi_major_axis = "0.05 au", eccentricity = 0.0 }'
TURNING = {
    "arcs": {"sun": '[sun]\ndistance = "0.05 au"\ntide = false\n', "gas": ""},
    "lanes": {"sun": '[sun]\ndistance = "0.05 au"\ntide = false\nshadow = "none"\n', "gas": SUNLIT_LOSS},
    "moving": {
        "sun": '[sun]\ntrue_anomaly = "0 deg"\ntide = false\nshadow = "none"\nmotion = "moving"\n',
        "gas": SUNLIT_LOSS,
        "orbit": CIRCLE,
    },
}


@pytest.mark.parametrize("how", TURNING)
def test_the_turning_of_the_frame_is_no_velocity(traced, how):
    # Seen from dusk, the Sun at the left, forty pixels along the jet. The jet's atoms fly on straight lines while the
    # axes turn: an atom launched t ago at 1 km/s has left by the angle -Omega t, and recedes at 1000 sin(Omega t) from
    # dusk, less the Omega R that the ground gave it. In the turning frame it seems to recede at twice that.
    look = picture("dusk", '"dusk"', left=-40, right=0, low=-1, high=1, columns=40)
    ds = traced(run_text(look, particles=200, **TURNING[how]))
    x = -ds.dusk_horizontal.values
    beyond = x > 2.0 * RADIUS
    found = ds.mean_velocity_dusk.values[0, 0][beyond]
    time = (x[beyond] - RADIUS) / 1000.0
    angle = OMEGA * time
    # x = (R + 1000 t) cos + Omega R t sin, so the time is a little longer than that; one round is enough.
    time = (x[beyond] / np.cos(angle) - RADIUS) / 1000.0
    angle = OMEGA * time
    expected = 1000.0 * np.sin(angle) - OMEGA * RADIUS * np.cos(angle)
    assert expected.max() > 60.0
    # A pixel is 100 s long, in which the velocity changes by 2 m/s; some hundred samples lie in each.
    np.testing.assert_allclose(found, expected, atol=0.5)
    seeming = expected + OMEGA * x[beyond]
    assert (seeming - found).max() > 60.0


TEMPERATURE, MASS, OUTER = 1000.0, 18.0, 60.0
MEAN_SPEED = sqrt(8.0 * BOLTZMANN * TEMPERATURE / (pi * MASS * ATOMIC_MASS))
MEAN_SQUARE = 3.0 * BOLTZMANN * TEMPERATURE / (MASS * ATOMIC_MASS)


def at_point(s, b):
    """Return (density, mean and mean square velocity along the line times density) at `s` on the line `b`; R = 1.

    Own derivation. What leaves a sphere by the cosine law with flux-weighted Maxwellian speeds, without gravity, has a
    Maxwellian's phase-space density (Liouville) in the cone of directions that come from the sphere: half angle
    asin(1/r), c its cosine. So the density goes as 1 - c, the cosine mu of the angle to the vertical is even in
    [c, 1], <mu> = (1 + c)/2 and <mu^2> = (1 + c + c^2)/3; speeds are those inside a gas. `s` grows away from the
    viewer, and s/r is the cosine between the line and the vertical.
    """
    r2 = b * b + s * s
    c = np.sqrt(np.maximum(0.0, 1.0 - 1.0 / r2))
    along = s * s / r2
    mu2 = (1.0 + c + c * c) / 3.0
    # 1 - c, without its rounding far out.
    density = 1.0 / (r2 * (1.0 + c))
    mean = MEAN_SPEED * s / np.sqrt(r2) * 0.5 * (1.0 + c)
    square = MEAN_SQUARE * (along * mu2 + 0.5 * (1.0 - along) * (1.0 - mu2))
    return np.array([density, density * mean, density * square])


def along_line(b, outer):
    """Return the integrals of `at_point` over the part of the line that the viewer sees."""
    end = sqrt(outer * outer - b * b)
    last = -sqrt(1.0 - b * b) if b < 1.0 else end
    scale = max(b, 1.0)
    points = [p * scale for p in (-100, -10, -3, -1.5, -1, 0, 1, 1.5, 3, 10, 100) if -end < p * scale < last]
    return quad_vec(lambda s: at_point(s, b), -end, last, points=points, epsrel=1e-9)[0]


def test_moments_of_a_line_of_sight_have_their_limits():
    # Through the centre of the disc, to infinity: mean -v/(pi - 2), v the mean speed. The integrals of 1/(2 r^2) and of
    # 1 - sqrt(1 - 1/r^2) from 1 on are 1/2 and pi/2 - 1.
    column, mean, _ = along_line(0.0, 1e4)
    assert mean / column == pytest.approx(-MEAN_SPEED / (pi - 2.0), rel=2e-4)
    # Far from the body the gas flies straight up: half of the mean square speed, 3kT/2m, lies along the line.
    column, mean, square = along_line(300.0, 3e6)
    assert square / column == pytest.approx(0.5 * MEAN_SQUARE, rel=1e-3)
    assert abs(mean / column) < 1e-6 * MEAN_SPEED


def in_pixel(middle, size):
    """Return mean and standard deviation over a square pixel, by Gauss's rule over its area."""
    nodes, weights = np.polynomial.legendre.leggauss(4)
    sums = np.zeros(3)
    for u, wu in zip(nodes, weights, strict=True):
        for v, wv in zip(nodes, weights, strict=True):
            b = float(np.hypot(middle[0] + 0.5 * size * u, middle[1] + 0.5 * size * v))
            sums += wu * wv * along_line(b, OUTER)
    mean = sums[1] / sums[0]
    return mean, sqrt(sums[2] / sums[0] - mean * mean)


@pytest.fixture(scope="module")
def free(traced):
    release = 'speed = { law = "maxwell-flux", temperature = "1000 K" }\n'
    look = picture("north", '"north"', left=-4.5, right=4.5, low=-4.5, high=4.5, columns=45, rows=45)
    return traced(run_text(look, release=release, outer=OUTER, particles=10_000, batches=30))


@pytest.mark.parametrize("place", [(0.0, 0.0), (0.4, 0.4), (2.0, 0.0), (-1.4, -1.4), (0.0, 3.6)])
def test_free_maxwellian_flux_has_the_analytic_moments(free, place):
    column = np.abs(free.north_horizontal.values / RADIUS - place[0]).argmin()
    row = np.abs(free.north_vertical.values / RADIUS - place[1]).argmin()
    pixel = free.isel(release=0, north_horizontal=column, north_vertical=row)
    mean, width = in_pixel(place, 0.2)
    # Student's t of 29 degrees of freedom beyond 4.2: 1.2e-4 each, ten comparisons.
    assert (
        abs(pixel.mean_velocity_north.item() - mean) < 4.2 * pixel.mean_velocity_north_standard_error.item()
    )
    assert (
        abs(pixel.velocity_width_north.item() - width)
        < 4.2 * pixel.velocity_width_north_standard_error.item()
    )
    # Which means something: the width of all launches, or a mean that forgets the cone, would lie far off.
    assert pixel.velocity_width_north_standard_error.item() < 0.06 * width
    assert pixel.mean_velocity_north_standard_error.item() < 0.06 * MEAN_SPEED


def test_errors_of_moments_are_the_scatter_between_replicates(free):
    # Mean and width of single replicates scatter by sqrt(30) times the error of all together, but for what differs
    # between a ratio's jackknife and its plain scatter where a pixel holds few atoms.
    inner = free.isel(release=0, north_horizontal=slice(15, 30), north_vertical=slice(15, 30))
    for name in ("mean_velocity_north", "velocity_width_north"):
        scatter = inner[name + "_replicates"].std("replicate", ddof=1) / sqrt(free.sizes["replicate"])
        ratio = (inner[name + "_standard_error"] / scatter).values
        assert np.isfinite(ratio).all()
        assert abs(np.median(ratio) - 1.0) < 0.1


def test_the_bins_have_the_moments_that_are_kept_beside_them(free):
    wide = free.isel(release=0, north_horizontal=22, north_vertical=22)
    v, bins = free.north_velocity.values, wide.column_by_velocity_north.values
    assert wide.column_outside_velocity_north.item() < 1e-3 * wide.column_north.item()
    mean = (v * bins).sum() / bins.sum()
    step = v[1] - v[0]
    assert abs(mean - wide.mean_velocity_north.item()) < 0.1 * step
    # A bin of width h adds about h^2/12 to the variance (Sheppard 1898).
    width = sqrt((v * v * bins).sum() / bins.sum() - mean * mean - step * step / 12.0)
    assert width == pytest.approx(wide.velocity_width_north.item(), rel=0.03)
