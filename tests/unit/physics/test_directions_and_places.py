"""Each law of direction and place against its distribution."""

import numpy as np
import pytest
from scipy.stats import beta, kstest, uniform

from tracer.physics.release.direction.cosine import Cosine
from tracer.physics.release.direction.isotropic import Isotropic
from tracer.physics.release.direction.normal import Normal
from tracer.physics.release.place.band import Band
from tracer.physics.release.place.cosine_power import CosinePower
from tracer.physics.release.place.patch import Patch
from tracer.physics.release.place.uniform import Uniform

COUNT = 20_000
FALSE_ALARM = 1e-3
"""Of one Kolmogorov-Smirnov test; fewer than twenty here, on fixed seeds."""

SUN = (1.0, 0.0, 0.0)
OBLIQUE = (0.48, -0.6, 0.64)


def cosines(law) -> np.ndarray:
    return law.zenith_cosines(np.random.default_rng(3).random(COUNT))


def places(law) -> np.ndarray:
    found = law.places(np.random.default_rng(4).random((COUNT, 2)))
    np.testing.assert_allclose(np.linalg.norm(found, axis=1), 1.0, rtol=1e-14)
    return found


def azimuths(found: np.ndarray, axis) -> np.ndarray:
    """Return the angles about `axis` as shares of a turn, from an arbitrary direction."""
    first = np.cross(axis, (0.3, 0.5, -0.9))
    first /= np.linalg.norm(first)
    return np.arctan2(found @ np.cross(axis, first), found @ first) / (2.0 * np.pi) + 0.5


@pytest.mark.parametrize("power", [0.5, 1.0, 2.0, 7.0])
def test_cosine_law_has_its_power(power):
    # Flux per solid angle ~ mu^power on 2 pi d(mu): the cosine is beta distributed with a = power + 1, b = 1.
    found = cosines(Cosine(power))
    assert kstest(found, beta(power + 1.0, 1.0).cdf).pvalue > FALSE_ALARM
    assert kstest(found, beta(1.1 * (power + 1.0), 1.0).cdf).pvalue < 1e-10
    assert found.min() > 0.0


def test_cosines_square_is_even_for_lamberts_law():
    assert kstest(cosines(Cosine(1.0)) ** 2, uniform.cdf).pvalue > FALSE_ALARM


def test_isotropic_directions_are_even_in_the_cosine_and_no_cosine_law():
    found = cosines(Isotropic())
    assert kstest(found, uniform.cdf).pvalue > FALSE_ALARM
    assert kstest(found**2, uniform.cdf).pvalue < 1e-100
    assert found.min() > 0.0


def test_normal_is_straight_up():
    assert np.all(cosines(Normal()) == 1.0)


def test_uniform_places_are_even_over_the_sphere():
    found = places(Uniform())
    # On a sphere each coordinate is even between -1 and 1 (Archimedes).
    for axis in range(3):
        assert kstest(found[:, axis], uniform(-1.0, 2.0).cdf).pvalue > FALSE_ALARM
    assert kstest(np.arcsin(found[:, 2]), uniform(-np.pi / 2.0, np.pi).cdf).pvalue < 1e-100


@pytest.mark.parametrize(("toward", "power"), [(SUN, 1.0), ((0.0, -1.0, 0.0), 2.0), (OBLIQUE, 0.3)])
def test_cosine_power_places_thin_out_from_their_direction(toward, power):
    found = places(CosinePower(toward, power))
    angle_cosine = found @ toward
    assert angle_cosine.min() >= 0.0
    assert kstest(angle_cosine, beta(power + 1.0, 1.0).cdf).pvalue > FALSE_ALARM
    assert kstest(azimuths(found, np.array(toward)), uniform.cdf).pvalue > FALSE_ALARM
    assert kstest(found @ SUN if toward != SUN else found[:, 1], beta(power + 1.0, 1.0).cdf).pvalue < 1e-100


def test_patch_is_even_within_its_angle():
    found = places(Patch(OBLIQUE, 0.4))
    angle_cosine = found @ OBLIQUE
    assert np.arccos(angle_cosine.min()) <= 0.4 + 1e-12
    assert kstest(angle_cosine, uniform(np.cos(0.4), 1.0 - np.cos(0.4)).cdf).pvalue > FALSE_ALARM
    assert kstest(azimuths(found, np.array(OBLIQUE)), uniform.cdf).pvalue > FALSE_ALARM
    assert kstest(np.arccos(angle_cosine), uniform(0.0, 0.4).cdf).pvalue < 1e-100


def test_patch_of_a_few_metres_keeps_its_shape():
    found = places(Patch((0.0, 0.0, 1.0), 1e-6))
    across = np.hypot(found[:, 0], found[:, 1])
    assert kstest((across / 1e-6) ** 2, uniform.cdf).pvalue > FALSE_ALARM


def test_band_is_even_between_its_latitudes():
    found = places(Band(-20.0, 50.0))
    low, high = np.sin(np.radians([-20.0, 50.0]))
    assert kstest(found[:, 2], uniform(low, high - low).cdf).pvalue > FALSE_ALARM
    assert kstest(azimuths(found, np.array([0.0, 0.0, 1.0])), uniform.cdf).pvalue > FALSE_ALARM
    latitude = np.degrees(np.arcsin(found[:, 2]))
    assert kstest(latitude, uniform(-20.0, 70.0).cdf).pvalue < 1e-10
