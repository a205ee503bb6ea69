"""A product that is saved and opened is the same product."""

import tempfile
from pathlib import Path

import numpy as np
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

from tracer.fate import FATE_LABELS
from tracer.product.assembling import assemble
from tracer.product.checksum import data_checksum
from tracer.product.layout import layout
from tracer.product.provenance import global_attributes
from tracer.product.reading import open_product
from tracer.product.writing import save_product
from tracer.tally.axes import direction, make_grid, make_image_plane
from tracer.tally.field import FieldStatistics

SPECIAL = [0.0, -0.0, np.nan, np.inf, 5e-324, 1.7976931348623157e308, 9.969209968386869e36]
"""Values that a file format may mistake: signed zeros, ends of the range, netCDF's own default fill value."""

names = st.text(st.characters(exclude_categories=["Cs"], exclude_characters="\0"), min_size=1, max_size=12)
cells = st.integers(1, 3)


@st.composite
def products(draw):
    releases = draw(st.lists(names, min_size=1, max_size=3, unique=True))
    grid = make_grid(draw(st.floats(1e2, 1e8)), 1e3, 1e7, draw(cells), draw(cells), draw(cells))
    toward = direction(draw(st.floats(-90, 90)), draw(st.floats(0, 24)))
    pixels = (draw(cells), draw(cells))
    velocity = draw(st.none() | st.just((-1e3, 2e3, 3)))
    titles = draw(st.lists(names, max_size=2))
    planes = [
        make_image_plane(f"image_{number}", title, toward, (-1e6, 2e6), (0.0, 1e6), pixels, velocity)
        for number, title in enumerate(titles)
    ]
    sizes = {"release": len(releases), "fate": len(FATE_LABELS)}
    sizes |= {"altitude": len(grid.altitude_edges) - 1, "latitude": len(grid.latitude_edges) - 1}
    sizes |= {"local_time": len(grid.local_time_edges) - 1}
    for plane in planes:
        sizes |= {f"{plane.name}_horizontal": pixels[0], f"{plane.name}_vertical": pixels[1]}
        sizes |= {f"{plane.name}_velocity": 3}
    random = np.random.default_rng(draw(st.integers(0, 2**32)))
    replicates = draw(st.integers(0, 2))
    fields = {}
    images = [plane.name for plane in planes]
    for name, row in layout(images, velocities=images if velocity else ()).items():
        shape = tuple(sizes[axis] for axis in row.dimensions)
        mean, error = random.choice([*SPECIAL, *random.normal(size=5)], (2, *shape))
        kept = random.normal(size=(replicates, *shape)) if replicates else None
        if row.tallied:
            fields[name] = FieldStatistics(mean, error, kept)
    attributes = {**global_attributes(draw(names), draw(names)), "seed": draw(st.integers(0, 2**63 - 1))}
    return assemble(grid, planes, releases, fields, {}, attributes)


@settings(max_examples=15, deadline=None, derandomize=True)
@given(products())
def test_saved_product_opens_as_the_same_product(ds):
    with tempfile.TemporaryDirectory() as folder:
        first, second = Path(folder) / "first.nc", Path(folder) / "second.nc"
        save_product(ds, first)
        with open_product(first) as opened:
            save_product(opened, second)
            loaded = opened.load()
        with open_product(second) as copy:
            assert data_checksum(loaded) == data_checksum(copy) == data_checksum(ds) == copy.data_checksum
        xr.testing.assert_equal(loaded, ds)
        assert {name: loaded.attrs[name] for name in ds.attrs} == ds.attrs
