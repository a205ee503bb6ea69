"""Figures look as they did when they were looked at: brightness in coarse squares, which no change of letters moves."""

from functools import partial
from pathlib import Path

import numpy as np
import pytest

from tracer.plots.density import density
from tracer.plots.ground_map import vertical_column
from tracer.plots.image import image
from tracer.plots.plan_table import read_plan
from tracer.plots.profile import profile
from tracer.plots.style import styled
from tracer.plots.tail import tail
from tracer.plots.timeline import timeline
from tracer.plots.velocity import velocity

LOOKS = Path(__file__).parent / "looks"
SQUARES = (24, 32)
TOLERANCE = 0.01
"""Root mean square of differences in brightness, which runs from 0 to 1; a mirrored figure differs more."""

FIGURES = {
    "column": vertical_column,
    "density": density,
    "image": partial(image, name="from_dusk", line="na_d2"),
    "profile": profile,
    "tail": partial(tail, name="from_dusk"),
    "velocity": partial(velocity, line="na_d2"),
}


@pytest.fixture
def gas(make_product):
    """Return a product that thins out with altitude and towards the night, with a corner that says nothing."""
    product = make_product(releases=("impact vapour", "sputtering"), replicates=4, resolved=("from_dusk",))
    sunny = 1.2 + np.cos(np.radians(15.0 * (product.local_time - 12.0)))
    thin = np.exp(-product.altitude / product.body_radius)
    north = 1.5 + np.sin(np.radians(product.latitude))
    for name, shape in (("number_density", thin * sunny * north), ("vertical_column", sunny * north)):
        for end in ("", "_standard_error", "_replicates"):
            stored = product[name + end]
            product[name + end].values[...] = (stored * shape).transpose(*stored.dims).values
    away = np.exp(product.from_dusk_horizontal / (2.0 * product.body_radius))
    for name in ("column_from_dusk", "brightness_from_dusk"):
        for end in ("", "_standard_error", "_replicates"):
            stored = product[name + end]
            product[name + end].values[...] = (stored * away).transpose(*stored.dims).values
    product.vertical_column_standard_error.values[:, 0, :2] *= 20.0
    # Lines that are wider and recede faster down the tail.
    line = away * np.exp(-((product.from_dusk_velocity / 2e3 - 0.5) ** 2))
    for end in ("", "_replicates"):
        stored = product["brightness_by_velocity_from_dusk" + end]
        stored.values[...] = (stored * line).transpose(*stored.dims).values
        for name in ("line_shift_from_dusk", "line_width_from_dusk"):
            product[name + end].values[...] *= away.values
    return product


def squares(figure) -> np.ndarray:
    """Return the mean brightness of the drawn figure in coarse squares, 0 black and 1 white."""
    with styled():
        figure.canvas.draw()
    pixels = np.asarray(figure.canvas.buffer_rgba())[..., :3] / 255.0
    bright = pixels @ (0.299, 0.587, 0.114)
    rows, columns = (
        np.linspace(0, size, count + 1).astype(int) for size, count in zip(bright.shape, SQUARES, strict=True)
    )
    sums = np.add.reduceat(np.add.reduceat(bright, rows[:-1], axis=0), columns[:-1], axis=1)
    return sums / np.outer(np.diff(rows), np.diff(columns))


def difference(name: str, found: np.ndarray) -> float:
    """Return the root mean square of differences from the stored look, two digits of hexadecimals a square."""
    lines = (LOOKS / f"{name}.txt").read_text(encoding="ascii").split()
    stored = np.array([list(bytes.fromhex(line)) for line in lines]) / 255.0
    return float(np.sqrt(np.mean((found - stored) ** 2)))


def check(name: str, figure, update: bool) -> None:
    found = squares(figure)
    if update:
        lines = [bytes(row).hex() for row in np.rint(255.0 * found).astype(np.uint8)]
        (LOOKS / f"{name}.txt").write_text("\n".join(lines) + "\n", encoding="ascii")
        pytest.skip("look written anew: look at it")
    assert difference(name, found) < TOLERANCE


@pytest.mark.parametrize("width", ["column", "full"])
@pytest.mark.parametrize("name", FIGURES)
def test_figure_looks_as_it_did(gas, name, width, update_looks):
    check(f"{name}-{width}", FIGURES[name](gas, width=width), update_looks)


def test_plan_looks_as_it_did(make_plan, update_looks):
    check("plan-full", timeline(read_plan(make_plan(rows=12, forbidden=(8, 9)))), update_looks)


def mirrored(product):
    """Return the product with noon and midnight, and left and right of images, in each other's place."""
    turned = product.copy(deep=True)
    for name, stored in product.data_vars.items():
        if str(name).endswith("_bounds"):
            continue
        if "local_time" in stored.dims:
            half = product.sizes["local_time"] // 2
            turned[name].values[...] = np.roll(stored.values, half, stored.get_axis_num("local_time"))
        if "from_dusk_horizontal" in stored.dims:
            turned[name].values[...] = stored.values[..., ::-1]
    return turned


@pytest.mark.parametrize("name", FIGURES)
def test_mirrored_product_looks_different(gas, name):
    found = squares(FIGURES[name](mirrored(gas), width="full"))
    assert difference(f"{name}-full", found) > 1.5 * TOLERANCE
