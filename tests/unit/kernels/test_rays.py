"""The compiled sum along rays is that of its Python source."""

import numpy as np

from tracer.kernels.rays import Contents, Paths, SphericalCells, Sums, integrate
from tracer.physics.sunlight import shadow_of


def test_compiled_sums_along_rays():
    random = np.random.default_rng(8)
    hours = (np.arange(5) / 5 - 0.5) * 2.0 * np.pi
    cells = SphericalCells(
        radii=np.array([1.0, 1.3, 2.0, 4.0]),
        sines=np.sin(np.radians([-90.0, -30.0, 30.0, 90.0])),
        cones=np.array([0.5]),
        equator=False,
        cosines_of_time=np.cos(hours),
        sines_of_time=np.sin(hours),
    )
    means = random.choice([0.0, 1.0, 2.0], (45, 3))
    decays = random.choice([0.0, 1.0], (45, 3))
    contents = Contents(2, means, np.full((45, 3), 1.1), decays, random.random((45, 3, 4)).astype(np.float32))
    look = random.normal(size=(12, 3))
    look /= np.linalg.norm(look, axis=1)[:, None]
    place = random.normal(size=(12, 3))
    along = np.sum(place * look, axis=1)
    paths = Paths(place - along[:, None] * look, look, np.full(12, -5.0), np.full(12, np.inf))
    shadow = shadow_of("cylinder", 1.0, 1e3)
    sums = [Sums(np.zeros((12, 3)), np.zeros((12, 2)), np.zeros((12, 3, 4)), np.zeros(12)) for _ in range(2)]
    integrate(cells, shadow, contents, paths, sums[0])
    integrate.py_func(cells, shadow, contents, paths, sums[1])
    assert np.all(sums[0].all.sum(axis=0) > 0.0)
    assert np.any(sums[0].lit < sums[0].all[:, :2])
    for compiled, plain in zip(*sums, strict=True):
        np.testing.assert_allclose(compiled, plain, rtol=1e-13)
