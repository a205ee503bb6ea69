"""The visible part of the Sun's disc against an overlap counted point by point on the sky."""

import math

import numpy as np
import pytest

from tracer.kernels.shadow import ANTUMBRA, LIT, PENUMBRA, UMBRA, lit_fraction, zone_at
from tracer.kernels.sunlight import GENTLE, covered_fraction, visible_fraction
from tracer.physics.sunlight import shadow_of

RADIUS = 2439.4e3
DISTANCE = 5.2e10
SUN = 6.957e8
HALF_SUN = math.asin(SUN / DISTANCE)


def counted_fraction(place, rings=400, spokes=720):
    """Share of rays to the Sun's disc, evenly spread over its solid angle, that miss the body's sphere."""
    to_sun = np.array([DISTANCE, 0.0, 0.0]) - place
    axis = to_sun / np.linalg.norm(to_sun)
    half = math.asin(SUN / np.linalg.norm(to_sun))
    side = np.cross(axis, [0.0, 0.6, 0.8])
    side /= np.linalg.norm(side)
    other = np.cross(axis, side)
    cosine = 1.0 - (np.arange(rings) + 0.5) / rings * (1.0 - math.cos(half))
    angle = (np.arange(spokes) + 0.5) / spokes * 2.0 * math.pi
    across = np.cos(angle)[:, None] * side + np.sin(angle)[:, None] * other
    rays = cosine[:, None, None] * axis + np.sqrt(1.0 - cosine**2)[:, None, None] * across
    ahead = rays @ place
    nearest_squared = place @ place - ahead**2
    return float(np.mean((ahead > 0.0) | (nearest_squared > RADIUS**2)))


def seen(place):
    return visible_fraction(*place, DISTANCE, RADIUS, SUN)


@pytest.mark.parametrize("behind", [0.0, 1e5, 1e6, 1e7, 1e8, 1.8e8, 2.2e8, 4e8, 2e9])
def test_visible_fraction_is_the_overlap_of_two_discs(behind):
    # Rows across umbra, penumbra and light, and behind the umbra's tip (75 radii here) across the antumbra.
    edge = RADIUS + np.linspace(-1.5, 1.5, 13) * behind * math.tan(HALF_SUN)
    for rho in edge:
        place = np.array([-behind, 0.6 * rho, 0.8 * rho])
        if place @ place >= RADIUS**2:
            assert seen(place) == pytest.approx(counted_fraction(place), abs=1e-3)


def test_on_the_ground_the_sun_sets_across_the_terminator():
    for elevation in np.linspace(-1.2, 1.2, 9) * HALF_SUN:
        # Seen from the ground, not from the centre, the Sun stands lower by R/d.
        angle = elevation + RADIUS / DISTANCE
        place = RADIUS * np.array([math.sin(angle), math.cos(angle), 0.0])
        # A straight horizon over a disc, the closed form of a circular segment.
        h = max(-1.0, min(1.0, elevation / HALF_SUN))
        segment = 0.5 + (h * math.sqrt(1.0 - h * h) + math.asin(h)) / math.pi
        assert seen(place) == pytest.approx(segment, abs=1e-3)


def test_annular_sun_is_one_less_the_square_of_the_radii():
    place = (-4e8, 0.0, 0.0)
    body, sun = math.asin(RADIUS / 4e8), math.asin(SUN / (DISTANCE + 4e8))
    assert seen(place) == pytest.approx(1.0 - (body / sun) ** 2, rel=1e-4)


def test_noon_is_lit_and_midnight_is_dark():
    assert seen((RADIUS, 0.0, 0.0)) == 1.0
    assert seen((-RADIUS, 0.0, 0.0)) == 0.0


@pytest.mark.parametrize("curvature", [1e-12, 1e-4, 0.05, -0.05])
def test_nearly_straight_edge_covers_half_of_the_disc(curvature):
    assert covered_fraction(0.0, curvature) == pytest.approx(0.5 - 0.106 * curvature, abs=2e-4)


@pytest.mark.parametrize("curvature", [0.0999, 0.03, -0.03, -0.0999])
def test_gentle_edge_covers_two_segments_to_the_last_digits(curvature):
    # The area of a lens, chord against either arc, in the extended precision of numpy.
    limb = np.linspace(-0.999, 0.999, 201).astype(np.longdouble)
    k = np.longdouble(curvature)
    chord = (limb + k * (1.0 + limb * limb) / 2) / (1 + k * limb)
    half = np.sqrt(1 - chord * chord)
    sliver = (np.arcsin(k * half) - k * half * np.sqrt(1 - (k * half) ** 2)) / (k * k)
    covered = (np.arccos(chord) - chord * half + sliver) / np.longdouble(math.pi)
    own = [covered_fraction(float(at), curvature) for at in limb]
    np.testing.assert_allclose(own, covered.astype(float), rtol=1e-12)


@pytest.mark.parametrize("limb", [-0.9, -0.2, 0.0, 0.4, 0.97])
def test_gentle_edge_goes_over_into_a_bent_one(limb):
    for curvature in (GENTLE, -GENTLE):
        inside, outside = (covered_fraction(limb, curvature * (1.0 + side * 1e-12)) for side in (-1.0, 1.0))
        assert inside == pytest.approx(outside, rel=1e-11)


def test_zones_agree_with_the_visible_fraction():
    rng = np.random.default_rng(1)
    shadow = shadow_of("penumbra", RADIUS, DISTANCE)
    behind = 10.0 ** rng.uniform(3.0, 9.5, size=5000)
    rho = RADIUS + rng.uniform(-1.5, 1.5, size=5000) * behind * math.tan(HALF_SUN)
    found = set()
    for x, y in zip(-behind, rho, strict=True):
        if x * x + y * y < RADIUS**2:
            continue
        zone = zone_at(shadow, x, y, 0.0)
        found.add(zone)
        fraction = visible_fraction(x, y, 0.0, DISTANCE, RADIUS, shadow.sun_radius)
        assert lit_fraction(shadow, zone, x, y, 0.0, DISTANCE) == pytest.approx(fraction, abs=1e-9)
        assert (fraction == 1.0) == (zone == LIT) or abs(fraction - 1.0) < 1e-9
        assert (fraction == 0.0) == (zone == UMBRA) or fraction < 1e-9
    assert found == {LIT, PENUMBRA, UMBRA, ANTUMBRA}


def test_penumbra_is_24_km_wide_a_thousand_kilometres_behind_mercury():
    # Computed for this project: 2 x 1,000 km x (Sun's angular radius at 0.387 au), 24 km.
    shadow = shadow_of("penumbra", RADIUS, 0.387 * 1.495978707e11)
    rho = RADIUS + np.linspace(-3e4, 3e4, 6001)
    zones = np.array([zone_at(shadow, -1e6, y, 0.0) for y in rho])
    assert np.sum(zones == PENUMBRA) * 10.0 == pytest.approx(24e3, rel=0.02)


def test_umbra_ends_70_to_100_radii_behind_mercury():
    # R / tan(solar angular radius) over Mercury's orbit, computed for this project.
    for distance_au in (0.3075, 0.4667):
        shadow = shadow_of("penumbra", RADIUS, distance_au * 1.495978707e11)
        tip = RADIUS / shadow.umbra_sine
        assert 65.0 < tip / RADIUS < 101.0
        assert zone_at(shadow, -0.99 * tip, 0.0, 0.0) == UMBRA
        assert zone_at(shadow, -1.01 * tip, 0.0, 0.0) == ANTUMBRA


def test_cylinder_and_no_shadow_are_what_their_names_say():
    cylinder = shadow_of("cylinder", RADIUS, DISTANCE)
    assert zone_at(cylinder, -1e9, 0.99 * RADIUS, 0.0) == UMBRA
    assert zone_at(cylinder, -1e9, 1.01 * RADIUS, 0.0) == LIT
    assert zone_at(cylinder, 1e7, 0.0, 0.0) == LIT
    assert zone_at(shadow_of("none", RADIUS, DISTANCE), -1e7, 0.0, 0.0) == LIT
