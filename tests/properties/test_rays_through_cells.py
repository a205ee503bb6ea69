"""Rays at edges, along the axis, grazing the ground and from inside: no path is lost and none counted twice."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tracer.observe.gas import gas_of
from tracer.observe.integration import integrals_along
from tracer.observe.sights import Sights, unit
from tracer.tally.axes import Grid, latitude_edges, local_time_edges

RADIUS = 1.8e6
EDGES = np.array([0.0, 2e4, 5e4, 3e5, 9e5, 4e6])
TOP = RADIUS + EDGES[-1]
LATITUDES, HOURS = 6, 8
RAYS_AN_EXAMPLE, EXAMPLES = 50, 200
FAMILIES = ("any", "edge", "axis", "grazing", "inside", "meridian", "cone")


def grid() -> Grid:
    return Grid(RADIUS, EDGES, latitude_edges(LATITUDES), local_time_edges(HOURS))


@pytest.fixture(scope="module")
def halves(filled):
    """Return a gas of three releases: everywhere, in every other cell, and in the cells between."""
    cells = np.indices((len(EDGES) - 1, LATITUDES, HOURS)).sum(axis=0) % 2
    # Two atoms per cubic metre or none: zeros beside zeros leave no slope to reconstruct.
    return gas_of(filled(grid(), np.stack([np.ones(cells.shape), cells, 1 - cells])))


def directions(random: np.random.Generator, count: int) -> np.ndarray:
    return unit(random.normal(size=(count, 3)))


def family_of_rays(name: str, seed: int) -> Sights:
    """Return rays of one kind, many of them exactly on edges as far as floats can be."""
    random = np.random.default_rng(seed)
    count = RAYS_AN_EXAMPLE
    look = directions(random, count)
    radii = random.choice([*(RADIUS + EDGES), 1.5 * RADIUS, 3.0 * TOP, 1e3 * TOP], count)
    start = directions(random, count) * radii[:, None]
    if name == "edge":
        latitude = np.radians(random.choice(latitude_edges(LATITUDES), count))
        angle = (random.choice(local_time_edges(HOURS), count) - 12.0) * np.pi / 12.0
        out = np.stack(
            [np.cos(latitude) * np.cos(angle), np.cos(latitude) * np.sin(angle), np.sin(latitude)], axis=1
        )
        start = out * radii[:, None]
    elif name == "axis":
        start = np.zeros((count, 3))
        start[:, 2] = radii * random.choice([-1.0, 1.0], count)
        start[: count // 2, 0] = random.choice([0.0, 1e-9, 1e3], count // 2)
        look = np.tile([0.0, 0.0, 1.0], (count, 1)) * random.choice([-1.0, 1.0], (count, 1))
    elif name == "grazing":
        out = directions(random, count)
        look = unit(np.cross(out, look))
        height = random.choice([0.0, 1e-6, -1e-6, 1.0, -1.0, 2e4, 5e4], count)
        start = out * (RADIUS + height)[:, None] - look * random.uniform(1.0, 5.0, count)[:, None] * TOP
    elif name == "inside":
        start = directions(random, count) * random.uniform(RADIUS, TOP, count)[:, None]
    elif name == "meridian":
        angle = (random.choice(local_time_edges(HOURS), count) - 12.0) * np.pi / 12.0
        across, up = random.normal(size=(2, count))
        look = unit(np.stack([across * np.cos(angle), across * np.sin(angle), up], axis=1))
        start = np.stack([np.cos(angle), np.sin(angle), 0.3 + 0.0 * angle], axis=1) * radii[:, None]
    elif name == "cone":
        # Along a cone of latitude, through its tip.
        latitude = np.radians(random.choice(latitude_edges(LATITUDES)[1:-1], count))
        angle = random.uniform(0.0, 2.0 * np.pi, count)
        out = np.stack(
            [np.cos(latitude) * np.cos(angle), np.cos(latitude) * np.sin(angle), np.sin(latitude)], axis=1
        )
        start, look = out * radii[:, None], out * random.choice([-1.0, 1.0], (count, 1))
    return Sights(start, look)


def chord(start: np.ndarray, look: np.ndarray) -> np.ndarray:
    """Return the length of each path between the ground and the top, by the roots of |start + t look| = radius."""
    start, look = np.asarray(start, np.longdouble), np.asarray(look, np.longdouble)
    look = look / np.sqrt((look * look).sum(axis=1))[:, None]
    b, square = (start * look).sum(axis=1), (start * start).sum(axis=1)

    def roots(limit: float) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        discriminant = b * b - square + np.longdouble(limit) ** 2
        root = np.sqrt(np.maximum(discriminant, 0))
        return discriminant > 0, -b - root, -b + root

    meets, enter, leave = roots(TOP)
    hits, ground, _ = roots(RADIUS)
    end = np.where(hits & (b < 0), np.maximum(ground, 0), leave)
    return np.where(meets, np.maximum(0, np.minimum(end, leave) - np.maximum(enter, 0)), 0).astype(float)


@given(name=st.sampled_from(FAMILIES), seed=st.integers(0, 2**32 - 1))
@settings(max_examples=EXAMPLES, deadline=None)
def test_every_path_is_counted_once(halves, name, seed):
    sights = family_of_rays(name, seed)
    outside = np.sqrt((sights.start**2).sum(axis=1)) >= RADIUS * (1.0 - 1e-13)
    sights = Sights(sights.start[outside], sights.look[outside])
    column = integrals_along(halves, sights).column
    assert np.all(np.isfinite(column))
    assert np.all(column >= 0.0)
    np.testing.assert_allclose(column[:, 1] + column[:, 2], column[:, 0], rtol=1e-12)
    # A chord near the top is known to the root of what rounding does to its distance.
    rounding = 1e-15 * np.sqrt((sights.start**2).sum(axis=1)).max()
    exact = chord(sights.start, sights.look)
    # Whether a ray at most a micrometre from grazing the ground is blocked is a matter of rounding: half its path or
    # all of it is right.
    along = (sights.start * sights.look).sum(axis=1)
    height = np.sqrt(((sights.start - along[:, None] * sights.look) ** 2).sum(axis=1)) - RADIUS
    touching = (np.abs(height) < 2e-6) & (along < 0.0)
    reach = np.sqrt(TOP**2 - RADIUS**2)
    whole = reach + np.minimum(reach, -along)
    half = whole - reach
    either = np.minimum(np.abs(column[:, 0] - whole), np.abs(column[:, 0] - half)) < 1e-5 * TOP
    assert np.all(either[touching])
    np.testing.assert_allclose(column[~touching, 0], exact[~touching], rtol=1e-9, atol=1e-3 + 1e3 * rounding)


@given(seed=st.integers(0, 2**32 - 1))
@settings(max_examples=10, deadline=None)
def test_path_in_each_cell_is_that_of_points_along_the_ray(filled, seed):
    random = np.random.default_rng(seed)
    shape = (len(EDGES) - 1, LATITUDES, HOURS)
    density = random.choice([0.0, 1.0], shape)
    gas = gas_of(filled(grid(), density[None]))
    start = directions(random, 8) * 2.0 * TOP
    aim = directions(random, 8) * random.uniform(0.0, TOP, 8)[:, None]
    sights = Sights(start, unit(aim - start))
    # Beside zeros and ones alone there is no slope: every cell is constant.
    assert np.all(gas.contents.decays == 0.0)
    column = integrals_along(gas, sights).column[:, 0]
    points, length = 200_001, 4.0 * TOP
    t = (np.arange(points) + 0.5) / points * length
    for ray in range(len(start)):
        place = start[ray] + t[:, None] * sights.look[ray]
        r = np.sqrt((place**2).sum(axis=1))
        hit = np.argmax(r < RADIUS) if np.any(r < RADIUS) else points
        shell = np.searchsorted(RADIUS + EDGES, r, side="right") - 1
        inside = (np.arange(points) < hit) & (r < TOP) & (r >= RADIUS)
        band = np.minimum(LATITUDES - 1, ((np.arcsin(place[:, 2] / r) / np.pi + 0.5) * LATITUDES).astype(int))
        hour = ((np.arctan2(place[:, 1], place[:, 0]) / (2 * np.pi) + 0.5) * HOURS).astype(int) % HOURS
        found = density[shell[inside], band[inside], hour[inside]].sum() * length / points
        assert column[ray] == pytest.approx(found, abs=60 * length / points)
