"""Columns along lines of sight through gas whose columns are known."""

from collections.abc import Callable
from math import exp, pi, sqrt

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import gamma, gammainc

from tracer.observe.sightlines import sightlines
from tracer.tally.axes import Grid, local_time_edges
from tracer.tally.axes import latitude_edges as even_latitudes

RADIUS = 1.8e6


def grid_of(altitude_edges, latitudes=4, hours=6) -> Grid:
    return Grid(RADIUS, np.asarray(altitude_edges), even_latitudes(latitudes), local_time_edges(hours))


def shell_means(density: Callable[[float], float], edges) -> np.ndarray:
    """Return the mean of `density` (of the distance from the centre) over each shell, by quadrature."""
    means = []
    for low, high in zip(edges[:-1] + RADIUS, edges[1:] + RADIUS, strict=True):
        content = quad(lambda r: density(r) * r * r, low, high, epsabs=0.0, epsrel=1e-12)[0]
        means.append(content / ((high**3 - low**3) / 3.0))
    return np.array(means)


def tangent_rays(altitudes) -> dict[str, np.ndarray]:
    count = len(altitudes)
    return {
        "observer_x_km": np.full(count, 3.0e5),
        "observer_y_km": np.linspace(-3e4, 5e4, count),
        "observer_z_km": np.full(count, 2e4),
        "tangent_altitude_km": np.asarray(altitudes) / 1e3,
        "tangent_latitude_deg": np.linspace(-60.0, 70.0, count),
        "tangent_local_time_h": np.linspace(1.0, 20.0, count),
    }


def quadrature(density: Callable[[float], float], altitude: float, top: float) -> float:
    """Return the tangent column up to `top`, both altitudes, by quadrature."""
    rho, reach = RADIUS + altitude, sqrt((RADIUS + top) ** 2 - (RADIUS + altitude) ** 2)
    points = np.geomspace(1e-3, 1.0, 12) * reach
    return (
        2.0
        * quad(
            lambda t: density(sqrt(rho * rho + t * t)), 0.0, reach, points=points, limit=400, epsrel=1e-10
        )[0]
    )


def test_column_through_a_sphere_of_constant_density_is_its_chord(filled):
    top = 3.0 * RADIUS
    grid = grid_of(np.concatenate(([0.0], np.geomspace(2e4, top, 20))), 9, 16)
    ds = filled(grid, np.full((2, 20, 9, 16), 5e7))
    altitudes = np.array([0.0, 1.0, 1e4, 2e4, 5e5, 2.999 * RADIUS])
    table = sightlines(ds, tangent_rays(altitudes))
    chord = 2.0 * np.sqrt((RADIUS + top) ** 2 - (RADIUS + altitudes) ** 2)
    np.testing.assert_allclose(table["column_m2"], 1e8 * chord, rtol=1e-9)
    np.testing.assert_array_equal(table["column_standard_error_m2"], 0.0)


def exponential(height: float) -> Callable[[float], float]:
    return lambda r: 1e10 * exp((RADIUS - r) / height)


def chamberlain(jeans: float) -> Callable[[float], float]:
    """Return n(r) above a uniform thermal source, Chamberlain 1963, Planet. Space Sci. 11, 901 (memory)."""
    G = gamma(1.5)

    def density(r: float) -> float:
        lam = jeans * RADIUS / r
        psi, s = lam * lam / (lam + jeans), sqrt(max(0.0, jeans * jeans - lam * lam)) / jeans
        inner, outer = gammainc(1.5, lam), gammainc(1.5, lam - psi)
        ballistic = 2.0 / sqrt(pi) * G * (inner - s * exp(-psi) * outer)
        escaping = G / sqrt(pi) * (1.0 - inner - s * exp(-psi) * (1.0 - outer))
        return 1e10 * exp(lam - jeans) * (ballistic + escaping)

    return density


@pytest.mark.parametrize(
    ("density", "height"),
    [(exponential(6e4), 6e4), (chamberlain(20.0), RADIUS / 20.0), (chamberlain(5.0), RADIUS / 5.0)],
    ids=["exponential", "chamberlain 20", "chamberlain 5"],
)
def test_tangent_columns_on_thin_cells_are_those_of_quadrature(filled, density, height):
    top = 12.0 * height
    edges = np.linspace(0.0, top, 241)
    ds = filled(
        grid_of(edges), np.broadcast_to(shell_means(density, edges)[None, :, None, None], (1, 240, 4, 6))
    )
    altitudes = height * np.array([0.0, 0.01, 0.026, 0.5, 1.0, 3.33, 7.0])
    table = sightlines(ds, tangent_rays(altitudes))
    exact = [quadrature(density, altitude, top) for altitude in altitudes]
    np.testing.assert_allclose(table["column_m2"], exact, rtol=5e-3)
    # Much closer than what is asked for: the worst is the ray on the ground, where Chamberlain's gas has a cusp.
    np.testing.assert_allclose(table["column_m2"], exact, rtol=5e-4)


@pytest.mark.parametrize(
    ("density", "limit"),
    [(exponential(1.5e5), 2e-3), (chamberlain(12.0), 2e-3)],
    ids=["exponential", "chamberlain"],
)
def test_error_on_the_default_grid_is_below_its_limit(filled, density, limit):
    # The default grid: first cell 10 km, top 10 radii, 50 cells; H = 150 km over Harrow is sodium at 1,200 K.
    edges = np.concatenate(([0.0], np.geomspace(1e4, 10.0 * RADIUS, 50)))
    ds = filled(
        grid_of(edges), np.broadcast_to(shell_means(density, edges)[None, :, None, None], (1, 50, 4, 6))
    )
    altitudes = np.array([0.0, 3e3, 1.2e4, 5e4, 1.4e5, 3e5, 6e5])
    table = sightlines(ds, tangent_rays(altitudes))
    exact = [quadrature(density, altitude, 10.0 * RADIUS) for altitude in altitudes]
    np.testing.assert_allclose(table["column_m2"], exact, rtol=limit)


def test_cell_means_alone_would_miss_the_half_per_cent(filled, monkeypatch):
    # The test above can fail: constant cells of H/2 are off by more than they may be.
    density, height = exponential(6e4), 6e4
    edges = np.linspace(0.0, 12.0 * height, 25)
    ds = filled(
        grid_of(edges), np.broadcast_to(shell_means(density, edges)[None, :, None, None], (1, 24, 4, 6))
    )
    rays = tangent_rays([0.05 * height])
    exact = quadrature(density, 0.05 * height, 12.0 * height)
    assert abs(sightlines(ds, rays)["column_m2"][0] / exact - 1.0) < 5e-4
    monkeypatch.setattr(
        "tracer.observe.gas.reconstruct", lambda means, radii: (np.ones_like(means), np.zeros_like(means))
    )
    assert abs(sightlines(ds, rays)["column_m2"][0] / exact - 1.0) > 5e-3
