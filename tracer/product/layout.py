"""Variables, dimensions and labels of a product.

A new variable is one new row of `ROWS`; a dimension with labels is one new row of `LABELS`.
"""

from collections.abc import Container, Iterable, Iterator, Mapping
from typing import Any, NamedTuple

PRODUCT_VERSION = 1
"""Version of the layout, written into every product; a reader refuses any other."""

STANDARD_ERROR = "_standard_error"
REPLICATES = "_replicates"
BOUNDS = "_bounds"

RELEASE, FATE, LINE = "release", "fate", "line"
ALTITUDE, LATITUDE, LOCAL_TIME = "altitude", "latitude", "local_time"
LAUNCH_SPEED, ORDER = "launch_speed", "launch_speed_order"
REPLICATE, EDGE = "replicate", "bounds"

ADSORBED_COLUMN = "adsorbed_column"
"""The one tallied variable that only runs have whose ground holds atoms for a while."""
HOST_IMPACT_RATE = "host_impact_rate"
"""The one tallied variable that only moons beside their host have."""

IMAGE = "<image>"
"""Stands for an image's product name in the rows below."""
HORIZONTAL, VERTICAL = IMAGE + "_horizontal", IMAGE + "_vertical"
VELOCITY = IMAGE + "_velocity"
"""Dimension of an image that is resolved by velocity along the line of sight."""


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


class Ratio(NamedTuple):
    """Names of the variables that belong together as weight, mean and standard deviation."""

    weight: str
    mean: str
    width: str


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
    velocity: bool = False
    """Only of images that are resolved by velocity."""
    ratio: "Ratio | None" = None
    """Of a mean or a width: what it is the mean or width of."""
    speeds: bool = False
    """Only where responses are kept by bins of launch speed."""
    image: str | None = None
    """Product name of the image, in a row that was written out for one."""


_GROUND = (RELEASE, LATITUDE, LOCAL_TIME)
_CELLS = (RELEASE, ALTITUDE, LATITUDE, LOCAL_TIME)
_PIXELS = (RELEASE, VERTICAL, HORIZONTAL)
_BINS = (RELEASE, VELOCITY, VERTICAL, HORIZONTAL)

_BY_COLUMN = Ratio("column_" + IMAGE, "mean_velocity_" + IMAGE, "velocity_width_" + IMAGE)
_BY_BRIGHTNESS = Ratio("brightness_" + IMAGE, "line_shift_" + IMAGE, "line_width_" + IMAGE)
_SPEEDS = (RELEASE, LAUNCH_SPEED, ORDER)

_PER_LAUNCH = "per rate of launches into a bin of speed, by Legendre order within the bin"

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
        "column_by_velocity_" + IMAGE,
        _BINS,
        "m-2",
        "column density along the line of sight in each bin of velocity away from the viewer",
        replicated=True,
        velocity=True,
    ),
    Variable(
        "column_outside_velocity_" + IMAGE,
        _PIXELS,
        "m-2",
        "column density along the line of sight outside all bins of velocity",
        replicated=True,
        velocity=True,
    ),
    Variable(
        _BY_COLUMN.mean,
        _PIXELS,
        "m s-1",
        "mean velocity away from the viewer weighted with the column density",
        replicated=True,
        velocity=True,
        ratio=_BY_COLUMN,
    ),
    Variable(
        _BY_COLUMN.width,
        _PIXELS,
        "m s-1",
        "standard deviation of the velocity along the line of sight weighted with the column density",
        replicated=True,
        velocity=True,
        ratio=_BY_COLUMN,
    ),
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
    Variable(
        "brightness_by_velocity_" + IMAGE,
        (LINE, *_BINS),
        "1e10 m-2 s-1",
        "brightness in rayleigh along the line of sight in each bin of velocity away from the viewer",
        replicated=True,
        lines=True,
        velocity=True,
    ),
    Variable(
        "brightness_outside_velocity_" + IMAGE,
        (LINE, *_PIXELS),
        "1e10 m-2 s-1",
        "brightness in rayleigh along the line of sight outside all bins of velocity",
        replicated=True,
        lines=True,
        velocity=True,
    ),
    Variable(
        _BY_BRIGHTNESS.mean,
        (LINE, *_PIXELS),
        "m s-1",
        "line shift: mean velocity away from the viewer weighted with the brightness",
        replicated=True,
        lines=True,
        velocity=True,
        ratio=_BY_BRIGHTNESS,
    ),
    Variable(
        _BY_BRIGHTNESS.width,
        (LINE, *_PIXELS),
        "m s-1",
        "line width: standard deviation of the velocity along the line of sight weighted with the brightness",
        replicated=True,
        lines=True,
        velocity=True,
        ratio=_BY_BRIGHTNESS,
    ),
    Variable(
        "vertical_column_response",
        (*_SPEEDS, LATITUDE, LOCAL_TIME),
        "s m-2",
        f"column density above the ground {_PER_LAUNCH}",
        replicated=True,
        speeds=True,
    ),
    Variable(
        "column_response_" + IMAGE,
        (*_SPEEDS, VERTICAL, HORIZONTAL),
        "s m-2",
        f"column density along the line of sight {_PER_LAUNCH}",
        replicated=True,
        speeds=True,
    ),
    Variable(
        "brightness_response_" + IMAGE,
        (LINE, *_SPEEDS, VERTICAL, HORIZONTAL),
        "1e10 m-2",
        f"brightness in rayleigh {_PER_LAUNCH}",
        replicated=True,
        lines=True,
        speeds=True,
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


def layout(
    images: Iterable[str] = (), lines: bool = False, velocities: Iterable[str] = (), speeds: bool = False
) -> dict[str, Variable]:
    """Return the product's variables by name, with every image row written out for each image.

    Parameters
    ----------
    images : iterable of str
        Product names of the images.
    lines : bool
        Whether the gas has lines.
    velocities : iterable of str
        Names of those images that are resolved by velocity.
    speeds : bool
        Whether responses are kept by bins of launch speed.

    Returns
    -------
    dict of str to Variable
        In the order of the file; standard errors and replicates are not listed apart.
    """
    return {variable.name: variable for variable in _written_out(images, lines, velocities, speeds)}


def has_lines(name: str) -> bool:
    """Return whether variable `name`, as written out for an image or not, has the dimension `line`."""
    stems = [row.name.split(IMAGE) for row in ROWS if row.lines]
    return any(name == stem[0] or (len(stem) > 1 and name.startswith(stem[0])) for stem in stems)


def variable_names(
    images: Iterable[str] = (), lines: bool = True, velocities: Iterable[str] = (), speeds: bool = False
) -> list[str]:
    """Return every name that a product with these images may hold, coordinates and bounds included.

    A name that comes twice means that two images, or their errors, would collide.
    """
    images, velocities = tuple(images), tuple(velocities)
    image_axes = [axis.replace(IMAGE, name) for name in images for axis in (VERTICAL, HORIZONTAL)]
    image_axes += [velocity_dimension(name) for name in velocities]
    names = [label.variable for label in LABELS]
    for axis in (ALTITUDE, LATITUDE, LOCAL_TIME, *image_axes, *((LAUNCH_SPEED,) if speeds else ())):
        names += [axis, axis + BOUNDS]
    # Not by the layout: in it one of two equal names would be lost.
    for variable in _written_out(images, lines, velocities, speeds):
        names.append(variable.name)
        names += [variable.name + STANDARD_ERROR] * variable.tallied
        names += [variable.name + REPLICATES] * variable.replicated
    return names


def image_dimensions(image: str) -> tuple[str, str]:
    """Return the names of an image's vertical and horizontal dimension."""
    return VERTICAL.replace(IMAGE, image), HORIZONTAL.replace(IMAGE, image)


def ratio_names(image: str, by_line: bool) -> Ratio:
    """Return which variables are the weight, mean and width of the velocity in an image, of its atoms or its lines."""
    return _named_for(image, _BY_BRIGHTNESS if by_line else _BY_COLUMN)


def velocity_dimension(image: str) -> str:
    """Return the name of an image's dimension of velocity."""
    return VELOCITY.replace(IMAGE, image)


def resolved_images(dimensions: Iterable[Any]) -> list[str]:
    """Return which images are resolved by velocity, by the dimensions of their product."""
    known = {str(dimension) for dimension in dimensions}
    names = [name.removesuffix(HORIZONTAL.removeprefix(IMAGE)) for name in sorted(known)]
    return [name for name in names if velocity_dimension(name) in known]


def why_no_product(attributes: Mapping[Any, Any], variables: Container[Any]) -> str | None:
    """Return why these attributes and variables are no product that this package knows; None if they are."""
    if attributes.get("product_version") is None or any(name not in variables for name in LANDMARKS):
        return "is not a product of this program"
    kind = attributes.get("product_kind", "run")
    if kind != "run":
        return f"is the product of a {kind}, not of a run; tracer sweep FILE --point N -o OUT.nc takes a run out of it"
    return why_other_version(attributes)


def why_other_version(attributes: Mapping[Any, Any]) -> str | None:
    """Return why a product with these attributes is of another version than this package reads; None if it is not."""
    version = attributes.get("product_version")
    if version != PRODUCT_VERSION:
        return f"is of product_version {version}; this package reads version {PRODUCT_VERSION}"
    return None


def _written_out(
    images: Iterable[str], lines: bool, velocities: Iterable[str], speeds: bool
) -> Iterator[Variable]:
    names, resolved = tuple(images), set(velocities)
    for row in ROWS:
        if (row.lines and not lines) or (row.speeds and not speeds):
            continue
        if IMAGE in row.name:
            yield from (_of_image(row, name) for name in names if name in resolved or not row.velocity)
        else:
            yield row


def _of_image(row: Variable, image: str) -> Variable:
    return row._replace(
        image=image,
        name=row.name.replace(IMAGE, image),
        dimensions=tuple(dimension.replace(IMAGE, image) for dimension in row.dimensions),
        ratio=row.ratio and _named_for(image, row.ratio),
    )


def _named_for(image: str, ratio: Ratio) -> Ratio:
    return Ratio(*(name.replace(IMAGE, image) for name in ratio))
