"""Variables, dimensions and labels of a product.

A new variable is one new row of `ROWS`; a dimension with labels is one new row of `LABELS`.
"""

from collections.abc import Container, Iterable, Mapping
from typing import Any, NamedTuple

PRODUCT_VERSION = 1
"""Version of the layout, written into every product; a reader refuses any other."""

STANDARD_ERROR = "_standard_error"
REPLICATES = "_replicates"
BOUNDS = "_bounds"

RELEASE, FATE, LINE = "release", "fate", "line"
ALTITUDE, LATITUDE, LOCAL_TIME = "altitude", "latitude", "local_time"
REPLICATE, EDGE = "replicate", "bounds"

ADSORBED_COLUMN = "adsorbed_column"
"""The one tallied variable that only runs have whose ground holds atoms for a while."""
HOST_IMPACT_RATE = "host_impact_rate"
"""The one tallied variable that only moons beside their host have."""

IMAGE = "<image>"
"""Stands for an image's product name in the rows below."""
HORIZONTAL, VERTICAL = IMAGE + "_horizontal", IMAGE + "_vertical"


class Label(NamedTuple):
    """A dimension whose positions have names."""

    dimension: str
    variable: str
    long_name: str


LABELS = (
    Label(RELEASE, "release_name", "name of the release"),
    Label(FATE, "fate_name", "how a particle's life ends"),
    Label(LINE, "line_name", "name of the emission line"),
)


class Variable(NamedTuple):
    """One variable of the product."""

    name: str
    dimensions: tuple[str, ...]
    unit: str
    long_name: str
    standard_name: str | None = None
    tallied: bool = True
    """Comes with `q_standard_error`."""
    replicated: bool = False
    """Also kept as `q_replicates`."""
    optional: bool = False
    """May be missing from a product."""
    lines: bool = False
    """Only where the gas has lines with known g."""
    image: str | None = None
    """Product name of the image, in a row that was written out for one."""


_GROUND = (RELEASE, LATITUDE, LOCAL_TIME)
_CELLS = (RELEASE, ALTITUDE, LATITUDE, LOCAL_TIME)
_PIXELS = (RELEASE, VERTICAL, HORIZONTAL)

ROWS = (
    Variable("number_density", _CELLS, "m-3", "number density", replicated=True),
    Variable(
        "vertical_column",
        _GROUND,
        "m-2",
        "column density above the ground, up to the top of the grid",
        replicated=True,
    ),
    Variable("column_" + IMAGE, _PIXELS, "m-2", "column density along the line of sight", replicated=True),
    Variable(
        "emission_rate",
        (LINE, *_CELLS),
        "m-3 s-1",
        "photons scattered per volume and time, in sunlight",
        replicated=True,
        lines=True,
    ),
    Variable(
        "brightness_" + IMAGE,
        (LINE, *_PIXELS),
        "1e10 m-2 s-1",
        "brightness in rayleigh along the line of sight",
        replicated=True,
        lines=True,
    ),
    Variable("release_flux", _GROUND, "m-2 s-1", "flux of new atoms from the surface, bounces not counted"),
    Variable("return_flux", _GROUND, "m-2 s-1", "flux of landing atoms, every landing counted"),
    Variable("capture_flux", _GROUND, "m-2 s-1", "flux of atoms that the surface keeps for good"),
    Variable(
        "escape_flux", _GROUND, "m-2 s-1", "flux of new atoms that escape, by the place of first release"
    ),
    Variable(
        "escape_rate_by_direction",
        _GROUND,
        "s-1 sr-1",
        "rate of escape per solid angle, by the place of crossing on the outer sphere",
    ),
    Variable(ADSORBED_COLUMN, _GROUND, "m-2", "column of atoms at rest on the ground", optional=True),
    Variable("ionization_rate", _CELLS, "m-3 s-1", "ions made by sunlight per volume and time"),
    Variable("ledger", (RELEASE, FATE), "s-1", "particle budget"),
    Variable(
        HOST_IMPACT_RATE,
        (RELEASE,),
        "s-1",
        "rate of atoms that hit the host planet, a part of other_loss",
        optional=True,
    ),
    Variable(
        "roulette_balance",
        (RELEASE,),
        "s-1",
        "what roulette added to the particle budget: nothing but for chance",
    ),
    Variable("mean_flights", (RELEASE,), "1", "launches per released atom"),
    Variable("mean_life", (RELEASE,), "s", "mean time from release to any end, time at rest included"),
    Variable(
        "surface_temperature",
        (LATITUDE, LOCAL_TIME),
        "K",
        "surface temperature",
        "surface_temperature",
        tallied=False,
        optional=True,
    ),
    Variable(
        "cell_volume", (ALTITUDE, LATITUDE), "m3", "volume of one cell at any local time", tallied=False
    ),
    Variable(
        "cell_area",
        (LATITUDE,),
        "m2",
        "ground area of one cell at any local time",
        "cell_area",
        tallied=False,
    ),
)

LANDMARKS = ("ledger", "release_name", "fate_name")
"""Variables without which a file is no product."""


def layout(images: Iterable[str] = (), lines: bool = False) -> dict[str, Variable]:
    """Return the product's variables by name, with every image row written out for each image.

    Parameters
    ----------
    images : iterable of str
        Product names of the images.
    lines : bool
        Whether the gas has lines.

    Returns
    -------
    dict of str to Variable
        In the order of the file; standard errors and replicates are not listed apart.
    """
    names = tuple(images)
    variables: dict[str, Variable] = {}
    for row in ROWS:
        if row.lines and not lines:
            continue
        for variable in [_of_image(row, name) for name in names] if IMAGE in row.name else [row]:
            variables[variable.name] = variable
    return variables


def has_lines(name: str) -> bool:
    """Return whether variable `name`, as written out for an image or not, has the dimension `line`."""
    stems = [row.name.split(IMAGE) for row in ROWS if row.lines]
    return any(name == stem[0] or (len(stem) > 1 and name.startswith(stem[0])) for stem in stems)


def variable_names(images: Iterable[str] = (), lines: bool = True) -> list[str]:
    """Return every name that a product with these images may hold, coordinates and bounds included.

    A name that comes twice means that two images, or their errors, would collide.
    """
    image_axes = [axis.replace(IMAGE, name) for name in images for axis in (VERTICAL, HORIZONTAL)]
    names = [label.variable for label in LABELS]
    for axis in (ALTITUDE, LATITUDE, LOCAL_TIME, *image_axes):
        names += [axis, axis + BOUNDS]
    for variable in layout(images, lines).values():
        names.append(variable.name)
        names += [variable.name + STANDARD_ERROR] * variable.tallied
        names += [variable.name + REPLICATES] * variable.replicated
    return names


def image_dimensions(image: str) -> tuple[str, str]:
    """Return the names of an image's vertical and horizontal dimension."""
    return VERTICAL.replace(IMAGE, image), HORIZONTAL.replace(IMAGE, image)


def why_no_product(attributes: Mapping[Any, Any], variables: Container[Any]) -> str | None:
    """Return why these attributes and variables are no product that this package knows; None if they are."""
    version = attributes.get("product_version")
    if version is None or any(name not in variables for name in LANDMARKS):
        return "is not a product of this program"
    if version != PRODUCT_VERSION:
        return f"is of product_version {version}; this package reads version {PRODUCT_VERSION}"
    return None


def _of_image(row: Variable, image: str) -> Variable:
    return row._replace(
        image=image,
        name=row.name.replace(IMAGE, image),
        dimensions=tuple(dimension.replace(IMAGE, image) for dimension in row.dimensions),
    )
