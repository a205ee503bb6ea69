"""Slit and seeing as a linear map from an image's pixels to the points of a profile."""

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_array, vstack
from scipy.special import gammaln, ndtr

from tracer.observe.fit.sky import FWHM_OF_GAUSSIAN, Aperture, Spread, Track

Floats = NDArray[np.float64]

MIXTURE_STEP = 0.3
"""Step in ln t between the Gaussians that make up a Moffat function; the trapezoidal rule is then exact to 1e-9."""
LEAST_WEIGHT = -25.0
"""Logarithm of the smallest weight of a Gaussian in it."""
WIDEST = -60.0
MOST_TILES = 32
"""Squares along one side of a slit that lies aslant of the pixels."""
ALIGNED = 1e-9
NEGLIGIBLE = 1e-9


class Boxes(NamedTuple):
    """Rectangles along the pixels' axes that make up an aperture: offsets and sizes [m], of equal weight, (T,)."""

    h: Floats
    v: Floats
    width: Floats
    height: Floats


def smearing(
    edges: tuple[Floats, Floats], track: Track, aperture: Aperture | None, spread: Spread | None
) -> csr_array:
    """Return the weights (N, rows x columns) of an image's pixels in the points of a profile.

    Each point is the mean over the aperture of the image convolved with the seeing in both directions; inside a pixel
    the image is taken as straight, with the slope between its neighbours, so that pixels blur nothing to second order.
    A Gaussian and a rectangle along the axes are integrated in closed form; a Moffat function is the mixture of
    Gaussians (1 + x)^-beta = integral of t^(beta - 1) exp(-t (1 + x)) dt / Gamma(beta); an aperture aslant is tiled
    with small squares. With neither, a point is the mean over an area of one pixel about it.
    Rows sum to 1 less what lies outside of the image.

    Parameters
    ----------
    edges : (vertical, horizontal)
        Edges of the pixels [m], shapes (rows + 1,) and (columns + 1,).
    track : Track
        The points.
    aperture : Aperture, optional
        The slit; a point where absent.
    spread : Spread, optional
        The seeing; none where absent.
    """
    widths, shares = _gaussians(spread)
    boxes = _pixel(edges) if aperture is None and spread is None else _boxes(aperture, _finest(edges, spread))
    rows = []
    for h, v in zip(track.h, track.v, strict=True):
        across = _shares(edges[1], h + boxes.h, boxes.width, widths)
        upwards = _shares(edges[0], v + boxes.v, boxes.height, widths)
        weights = np.einsum("k,tkv,tkh->vh", shares / len(boxes.h), upwards, across, optimize=True)
        weights[np.abs(weights) < NEGLIGIBLE] = 0.0
        rows.append(csr_array(weights.reshape(1, -1)))
    return csr_array(vstack(rows, format="csr"))


def _gaussians(spread: Spread | None) -> tuple[Floats, Floats]:
    """Return standard deviations [m] and weights of the Gaussians that make up the seeing; 0 without."""
    if spread is None:
        return np.zeros(1), np.ones(1)
    if spread.beta is None:
        return np.array([spread.fwhm / FWHM_OF_GAUSSIAN]), np.ones(1)
    # A radius a with (1 + (fwhm/2a)^2)^-beta = 1/2; a Gaussian of variance a^2/2t for each t ~ Gamma(beta - 1).
    scale = 0.5 * spread.fwhm / math.sqrt(2.0 ** (1.0 / spread.beta) - 1.0)
    power = spread.beta - 1.0
    log_t = np.arange(max(WIDEST, LEAST_WEIGHT / power), max(4.0, math.log(power) + 2.0), MIXTURE_STEP)
    log_weight = power * log_t - np.exp(log_t) - gammaln(power)
    kept = log_weight > LEAST_WEIGHT + log_weight.max()
    weight = np.exp(log_weight[kept])
    return scale / np.sqrt(2.0 * np.exp(log_t[kept])), weight / weight.sum()


def _finest(edges: tuple[Floats, Floats], spread: Spread | None) -> float:
    """Return the length [m] over which the smeared image is smooth."""
    pixel = min(float(np.diff(axis).min()) for axis in edges)
    return pixel if spread is None else max(pixel, spread.fwhm / FWHM_OF_GAUSSIAN)


def _pixel(edges: tuple[Floats, Floats]) -> Boxes:
    """Return the box of one pixel."""
    height, width = (np.array([float(np.diff(axis).mean())]) for axis in edges)
    return Boxes(np.zeros(1), np.zeros(1), width, height)


def _boxes(aperture: Aperture | None, finest: float) -> Boxes:
    if aperture is None:
        return Boxes(*(np.zeros(1) for _ in range(4)))
    c, s = math.cos(aperture.angle), math.sin(aperture.angle)
    if min(abs(c), abs(s)) < ALIGNED:
        width, height = (
            (aperture.length, aperture.width) if abs(s) < ALIGNED else (aperture.width, aperture.length)
        )
        return Boxes(np.zeros(1), np.zeros(1), np.array([width]), np.array([height]))
    counts = [
        min(MOST_TILES, 1 + math.ceil(4.0 * size / finest)) for size in (aperture.length, aperture.width)
    ]
    steps = [size / count for size, count in zip((aperture.length, aperture.width), counts, strict=True)]
    along, aside = np.meshgrid(
        *((np.arange(n) + 0.5 - 0.5 * n) * step for n, step in zip(counts, steps, strict=True))
    )
    # A tile aslant by an upright square of its area.
    side = np.full(along.size, math.sqrt(steps[0] * steps[1]))
    return Boxes((c * along - s * aside).ravel(), (s * along + c * aside).ravel(), side, side)


def _shares(edges: Floats, centres: Floats, sizes: Floats, widths: Floats) -> Floats:
    """Return the share (T, K, P) of each pixel in a mean over each box, smeared by each Gaussian.

    A pixel has its part of the smeared box, and its neighbours the part that its slope takes from them: half the first
    moment of the smeared box within it, plus and minus, over its width.
    """
    distance = edges[np.newaxis, np.newaxis, :] - centres[:, np.newaxis, np.newaxis]
    size, sigma = sizes[:, np.newaxis, np.newaxis], widths[np.newaxis, :, np.newaxis]
    if not sizes.any():
        below, area = (_integral(order, distance, sigma) for order in (0, 1))
    else:
        right, left = distance + 0.5 * size, distance - 0.5 * size
        below, area = ((_integral(n, right, sigma) - _integral(n, left, sigma)) / size for n in (1, 2))
    pixel = np.diff(edges)
    shares = np.diff(below, axis=2)
    moment = 0.5 * (below[..., 1:] + below[..., :-1]) - np.diff(area, axis=2) / pixel
    # Far off the difference is rounding; at the rim there is no neighbour to take a slope from.
    moment[shares < NEGLIGIBLE] = 0.0
    shares[..., 2:] += 0.5 * moment[..., 1:-1]
    shares[..., :-2] -= 0.5 * moment[..., 1:-1]
    return np.asarray(shares)


def _integral(order: int, x: Floats, sigma: Floats) -> Floats:
    """Return Phi(x/sigma) integrated `order` times, 0 to 2, from where it vanishes; the unit step without spread."""
    if not sigma.any():
        return np.asarray((np.heaviside(x, 0.5), np.maximum(x, 0.0), 0.5 * np.maximum(x, 0.0) ** 2)[order])
    z = x / sigma
    below, peak = ndtr(z), sigma * np.exp(-0.5 * z * z) / math.sqrt(2.0 * math.pi)
    if order == 0:
        return np.asarray(below)
    if order == 1:
        return np.asarray(x * below + peak)
    return np.asarray(0.5 * ((x * x + sigma * sigma) * below + x * peak))
