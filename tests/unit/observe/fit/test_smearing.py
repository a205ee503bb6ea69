"""Slit and seeing against closed forms: a Gaussian through seeing and a box is a difference of error functions."""

import math

import numpy as np
import pytest
from scipy.special import erf

from tracer.errors import InputError
from tracer.observe.fit.images import SkyImage, check_smearing, too_small
from tracer.observe.fit.sky import FWHM_OF_GAUSSIAN, Aperture, Spread, Track
from tracer.observe.fit.smearing import smearing

EDGES = np.linspace(-12.0, 12.0, 193)
SOURCE, SEEING, LENGTH, WIDTH = 1.3, 0.8, 2.0, 0.7
"""Standard deviations of source and seeing, sides of the slit."""
PLACES = np.linspace(-4.0, 4.0, 9)


def below(x, sigma):
    return 0.5 * (1.0 + erf(x / (sigma * math.sqrt(2.0))))


def gaussian_image(sigma):
    """Return the means over pixels of a round Gaussian of integral 1."""
    part = np.diff(below(EDGES, sigma)) / np.diff(EDGES)
    return np.outer(part, part)


def track(angle=0.0):
    return Track(PLACES, np.zeros(len(PLACES)), angle)


@pytest.mark.parametrize(("angle", "across", "upwards"), [(0.0, LENGTH, WIDTH), (90.0, WIDTH, LENGTH)])
def test_gaussian_through_seeing_and_slit_is_a_product_of_error_functions(angle, across, upwards):
    aperture = Aperture(LENGTH, WIDTH, math.radians(angle))
    weights = smearing((EDGES, EDGES), track(), aperture, Spread(SEEING * FWHM_OF_GAUSSIAN, None))
    seen = weights @ gaussian_image(SOURCE).ravel()
    # Convolution of Gaussians adds variances; the mean over a box is a difference of its integrals: own derivation.
    sigma = math.hypot(SOURCE, SEEING)
    mean_h = (below(PLACES + 0.5 * across, sigma) - below(PLACES - 0.5 * across, sigma)) / across
    mean_v = (below(0.5 * upwards, sigma) - below(-0.5 * upwards, sigma)) / upwards
    np.testing.assert_allclose(seen, mean_h * mean_v, rtol=2e-4)


def test_slit_aslant_agrees_with_quadrature():
    angle = math.radians(30.0)
    aperture = Aperture(LENGTH, WIDTH, angle)
    weights = smearing((EDGES, EDGES), track(), aperture, Spread(SEEING * FWHM_OF_GAUSSIAN, None))
    seen = weights @ gaussian_image(SOURCE).ravel()
    nodes, shares = np.polynomial.legendre.leggauss(30)
    along, aside = np.meshgrid(0.5 * LENGTH * nodes, 0.5 * WIDTH * nodes)
    h = PLACES[:, None, None] + math.cos(angle) * along - math.sin(angle) * aside
    v = math.sin(angle) * along + math.cos(angle) * aside
    variance = SOURCE**2 + SEEING**2
    density = np.exp(-(h**2 + v**2) / (2.0 * variance)) / (2.0 * math.pi * variance)
    expected = 0.25 * np.einsum("nij,i,j->n", density, shares, shares)
    np.testing.assert_allclose(seen, expected, rtol=2e-3)


@pytest.mark.parametrize("beta", [1.5, 2.5, 4.765])
def test_moffat_seeing_of_a_narrow_source_is_a_moffat_function(beta):
    weights = smearing((EDGES, EDGES), track(), None, Spread(3.0, beta))
    seen = weights @ gaussian_image(0.05).ravel()
    # (beta - 1)/(pi a^2) (1 + r^2/a^2)^-beta, a = fwhm/2 / sqrt(2^(1/beta) - 1): Moffat 1969, A&A 3, 455 (memory).
    scale = 1.5 / math.sqrt(2.0 ** (1.0 / beta) - 1.0)
    expected = (beta - 1.0) / (math.pi * scale**2) * (1.0 + (PLACES / scale) ** 2) ** -beta
    # The source has a width of its own, of 0.05 against 3, and a pixel of 0.125.
    np.testing.assert_allclose(seen, expected, rtol=5e-3)


def test_even_light_stays_as_it_is_where_nothing_lies_outside():
    for aperture in (None, Aperture(1.0, 0.5, 0.4)):
        weights = smearing((EDGES, EDGES), track(), aperture, Spread(1.0, None))
        np.testing.assert_allclose(weights.sum(axis=1), 1.0, atol=1e-6)


def test_a_slope_is_kept_by_coarse_pixels():
    edges = np.linspace(-12.0, 12.0, 25)
    image = np.broadcast_to(0.5 * (edges[1:] + edges[:-1]), (24, 24))
    weights = smearing((edges, edges), track(), None, None)
    np.testing.assert_allclose(weights @ image.ravel(), PLACES, atol=1e-12)


def test_images_too_small_or_too_coarse_are_named_or_refused():
    spread = Spread(3.0, None)
    for half, message in ((6.0, "lies outside of it"), (4.5, "run with a larger image")):
        edges = np.linspace(-half, half, 81)
        image, weights = SkyImage("tail", (edges, edges)), smearing((edges, edges), track(), None, spread)
        if half == 4.5:
            with pytest.raises(InputError, match=message):
                check_smearing(image, track(), weights, None, spread)
        else:
            assert message in check_smearing(image, track(), weights, None, spread)[0]
    for pixels, message in ((8, "are coarse for"), (2, "run with more pixels")):
        edges = np.linspace(-12.0, 12.0, pixels + 1)
        image, weights = SkyImage("tail", (edges, edges)), smearing((edges, edges), track(), None, spread)
        if pixels == 2:
            with pytest.raises(InputError, match="more pixels"):
                check_smearing(image, track(), weights, None, Spread(1.0, None))
        else:
            assert any(message in one for one in check_smearing(image, track(), weights, None, spread))


def test_profile_beyond_an_image_is_told_in_round_numbers():
    # cos(pi/2) is 6e-17: points on the axis lie off it by that.
    angle = 0.5 * np.pi
    places = 1e7 * np.arange(3.0)
    edges = np.linspace(-1e7, 1e7, 11)
    words = too_small(
        SkyImage("tail", (edges, edges)), Track(places * np.cos(angle), places * np.sin(angle), angle)
    )
    assert "upwards from -10000 to 10000 km, the profile from 0 to 20000 km" in words
    assert "rightwards from -10000 to 10000 km, the profile from 0 to 0 km" in words
