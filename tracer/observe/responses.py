"""Any law of launch speed from a product that keeps responses by bins of speed: trace once, ask later.

An atom launched at speed v contributes c(v) to a pixel, and a law p(v) the integral of p c. In each bin the product
knows the mean R0 of c and its mean R1 weighted with x, which runs from -1 to 1 through the bin; the law has there the
Legendre moments P, M and Q. A pixel is rate times the sum of P R0 + 3 M R1 + 5 Q R2, with R2 told from R0 and R1 of the
bin and of the one beside it (`within_bins`). How far off that may be is part of the error.
"""

from collections.abc import Iterator
from typing import Any, NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.observe.speed_laws import SpeedLawWords, speed_density
from tracer.observe.spread import standard_error
from tracer.observe.within_bins import BESIDE, Doubt, bend_weights, bias_bound, doubt_of
from tracer.physics.release.laws import SpeedDensity
from tracer.physics.release.speed_moments import legendre_moments
from tracer.product.layout import (
    BOUNDS,
    HORIZONTAL,
    IMAGE,
    LAUNCH_SPEED,
    LINE,
    ORDER,
    RELEASE,
    REPLICATE,
    REPLICATES,
    STANDARD_ERROR,
    Variable,
    layout,
)

Floats = NDArray[np.float64]

MOST_UNCOVERED = 0.01
"""Share of a law that may lie beyond the last bin; what it contributes is missing."""

MOST_BENT = 0.1
"""Sum over bins of the size of a law's second Legendre moment above which it is too narrow for the bins."""

LEAST_REPLICATES = 2

BIAS = "_within_bin_bias"
"""Ending of the variables that bound what the bins' width does."""

SCATTER = "_monte_carlo_error"
"""Ending of the variables with the part of the error that more launches make smaller."""

RESPONSE = "_response"


class BinsDoNotCover(InputError):
    """The bins of launch speed do not cover a law, or are too wide for it."""


class _Functional(NamedTuple):
    """What is made of a bin's two responses.

    `bins` in which the law has a part, and those beside; `field` (bins, order) are the weights of what is asked, for
    `rate` [s-1]; `doubt`, `edges` and `escape` are what `bias_bound` needs.
    """

    bins: slice
    field: Floats
    rate: float
    doubt: Doubt
    edges: Floats
    escape: float


def law_weights(law: SpeedLawWords | SpeedDensity, edges: Floats, mass: float, escape: float) -> Floats:
    """Return (bins, 2): the weights of R0 and R1 of each bin in what an atom per second by a law leaves.

    Parameters
    ----------
    law : mapping or SpeedDensity
        See `tracer.observe.speed_laws.speed_density`.
    edges : ndarray, shape (bins + 1,)
        Edges of the bins [m s-1]: `launch_speed_bounds` of the product.
    mass : float
        Mass of an atom [kg]: the attribute `atom_mass` of the product.
    escape : float
        Escape speed [m s-1]: the attribute `escape_speed` of the product.

    Raises
    ------
    BinsDoNotCover
        Where more than `MOST_UNCOVERED` of the law lies beyond the last bin, or it is too narrow for the bins.
    InputError
        Where the law has no density.

    Notes
    -----
    It takes some tenths of a millisecond.
    """
    return _weights(_moments(speed_density(law), edges, mass), edges, escape)


def law_doubt(law: SpeedLawWords | SpeedDensity, edges: Floats, mass: float) -> Doubt:
    """Return what the means of the bins leave open of a law, for `bias_bound`; see `law_weights`."""
    density = speed_density(law)
    return doubt_of(density, edges, mass, _moments(density, edges, mass))


def speed_edges(product: xr.Dataset) -> Floats:
    """Return the edges (bins + 1,) [m s-1] of a product's bins of launch speed.

    Raises
    ------
    InputError
        Where the product keeps no responses.
    """
    name = LAUNCH_SPEED + BOUNDS
    if name not in product:
        raise InputError("the product keeps no responses; add speed_bins = 32 to [ensemble] and run it again")
    bounds = product[name].values
    return np.append(bounds[:, 0], bounds[-1, 1])


def release_rate(product: xr.Dataset, release: int) -> float:
    """Return the rate [s-1] of new atoms of release number `release` in a product."""
    one = product.isel({RELEASE: release})
    return float(one["ledger"].sum() - one["roulette_balance"])


def evaluate_law(product: xr.Dataset, release: str | int, law: SpeedLawWords | SpeedDensity) -> xr.Dataset:
    """Return columns and brightness as one release would make them with another law of launch speed.

    Place, direction, rate and all that happens after launch stay those of the release.

    Parameters
    ----------
    product : xarray.Dataset
        Made with `speed_bins`, as `tracer.open_product` gives it.
    release : str or int
        Name or number of the release.
    law : mapping or SpeedDensity
        See `tracer.observe.speed_laws.speed_density`.

    Returns
    -------
    xarray.Dataset
        `vertical_column`, `column_<image>` and `brightness_<image>` as in the product, of this release alone. Each has
        `_replicates` and their `_monte_carlo_error`; `_within_bin_bias`, how far off the bins' width may have put it,
        at least 0 (`tracer.observe.within_bins.bias_bound`); and `_standard_error`, the root of the sum of the squares
        of these two, NaN where no atom was seen. Bins that no launch left anything from count as 0 in all of them. A
        variable's `bias_over_error` is the root of the sum of the squares of all its biases over that of its errors:
        near 1 the bins' width decides, and more `speed_bins` help more than more particles.
        The attribute `share_beyond_bins` is what of the law lies beyond the last bin.

    Raises
    ------
    BinsDoNotCover
        See `law_weights`.
    InputError
        An unknown release, a law that cannot be evaluated, or a product without responses or replicates.
    """
    number = _number_of(product, release)
    edges = speed_edges(product)
    density, mass = speed_density(law), float(product.attrs["atom_mass"])
    batches = np.atleast_1d(np.asarray(product.attrs.get("replicate_batches", ()), dtype=np.float64))
    if len(batches) < LEAST_REPLICATES:
        raise InputError(
            "the product keeps too few replicates for the errors of sums over bins; "
            "set [ensemble] replicates to 2 or more and run it again"
        )
    rate = release_rate(product, number)
    functional = _functional(density, edges, mass, float(product.attrs["escape_speed"]), rate)
    variables: dict[str, xr.DataArray] = {}
    for row in _response_rows(product):
        variables |= _evaluated(product, row, number, functional, batches)
    axes = {axis for one in variables.values() for axis in one.dims}
    bounds = {f"{axis}{BOUNDS}" for axis in axes} & {str(name) for name in product.data_vars}
    kept = ("title", "scene_hash", "body_radius", "sun_distance", "replicate_batches")
    return xr.Dataset(
        {**variables, **{name: product[name] for name in sorted(bounds)}},
        attrs={
            **{key: product.attrs[key] for key in kept if key in product.attrs},
            "speed_law": str(density),
            "release_rate": rate,
            "share_beyond_bins": density.share_above(float(edges[-1]), mass),
        },
    )


def _number_of(product: xr.Dataset, release: str | int) -> int:
    names = [str(name) for name in product["release_name"].values]
    if isinstance(release, str):
        if release not in names:
            raise InputError(f"{release!r} is no release of the product; it has {', '.join(names)}")
        return names.index(release)
    if not 0 <= release < len(names):
        raise InputError(f"the product has no release number {release}; it has {len(names)}, counted from 0")
    return release


def _moments(law: SpeedDensity, edges: Floats, mass: float) -> Floats:
    """Return the Legendre moments (bins, 3) of a law that the bins cover."""
    # A law as cold as no gas is overflows; it is refused below.
    with np.errstate(all="ignore"):
        beyond = law.share_above(float(edges[-1]), mass)
        moments = legendre_moments(law, edges, mass, 3)
    if beyond > MOST_UNCOVERED:
        raise BinsDoNotCover(
            f"{100.0 * beyond:.3g} % of the law is faster than the last bin, which ends at {edges[-1]:.5g} m s-1; at "
            f"most {100.0 * MOST_UNCOVERED:g} % may be. Run with this law, or a faster one, among the releases"
        )
    bent = float(np.abs(moments[:, 2]).sum())
    # A law narrower than the nodes of the quadrature is not even seen by it.
    if not (bent <= MOST_BENT and abs(moments[:, 0].sum() + beyond - 1.0) < MOST_UNCOVERED):
        raise BinsDoNotCover(
            "the law is narrower than the bins of launch speed can tell; run with more speed_bins, or with this law"
        )
    return moments


def _functional(density: SpeedDensity, edges: Floats, mass: float, escape: float, rate: float) -> _Functional:
    doubt = law_doubt(density, edges, mass)
    used = np.flatnonzero(doubt.moments.any(axis=1))
    bins = slice(max(0, int(used[0]) - BESIDE), int(used[-1]) + 1 + BESIDE)
    field = rate * _weights(doubt.moments, edges, escape)
    return _Functional(bins, field[bins], rate, doubt, edges, escape)


def _weights(moments: Floats, edges: Floats, escape: float) -> Floats:
    return np.asarray(moments[:, :2] * (1.0, 3.0) + bend_weights(moments[:, 2], edges, escape))


def _response_rows(product: xr.Dataset) -> Iterator[Variable]:
    ending = HORIZONTAL.removeprefix(IMAGE)
    images = [str(axis).removesuffix(ending) for axis in product.dims if str(axis).endswith(ending)]
    for row in layout(images, LINE in product.dims, speeds=True).values():
        if row.speeds and row.name in product:
            yield row


def _evaluated(
    product: xr.Dataset, row: Variable, number: int, functional: _Functional, batches: Floats
) -> dict[str, xr.DataArray]:
    # An image may have the word in its name as well.
    name = row.name.replace(RESPONSE, "", 1)
    chosen = {RELEASE: number, LAUNCH_SPEED: functional.bins}
    responses = _by_bin(product[row.name].isel(chosen))
    mean = np.tensordot(functional.field, responses, 2)
    bias = functional.rate * bias_bound(
        functional.doubt, functional.edges, functional.escape, responses, functional.bins.start
    )
    of_group = product[row.name + REPLICATES]
    replicates = np.array(
        [
            np.tensordot(functional.field, _by_bin(of_group.isel({**chosen, REPLICATE: group})), 2)
            for group in range(len(batches))
        ]
    )
    scatter = np.where(mean == 0.0, np.nan, standard_error(np.moveaxis(replicates, 0, -1), batches))
    error = np.hypot(scatter, bias)
    known = np.isfinite(error)
    # Relative to the largest error squares stay within a float's range.
    largest = float(error[known].max(initial=0.0)) or 1.0
    sizes = [float(np.sum((one[known] / largest) ** 2)) for one in (bias, error)]
    ratio = float(np.sqrt(sizes[0] / max(sizes[1], 1.0)))
    template = product[name].isel({RELEASE: [number]})
    place = template.dims.index(RELEASE)

    def like(values: Floats, words: str = "") -> xr.DataArray:
        attributes: dict[Any, Any] = {"units": template.attrs["units"]} if words else dict(template.attrs)
        attributes["long_name"] = words + str(template.attrs["long_name"])
        found = template.copy(data=np.expand_dims(values, place))
        found.attrs = attributes
        return found

    groups_of = like(mean, "means over groups of batches of ").expand_dims({REPLICATE: len(batches)})
    return {
        name: like(mean).assign_attrs(bias_over_error=ratio),
        name + STANDARD_ERROR: like(error, "standard error, with the bound of the within-bin bias, of "),
        name + SCATTER: like(scatter, "Monte Carlo error of "),
        name + REPLICATES: groups_of.copy(data=np.expand_dims(replicates, 1 + place)),
        name + BIAS: like(bias, "bound of what is wrong, since bins of launch speed have a width, with "),
    }


def _by_bin(response: xr.DataArray) -> Floats:
    """Return a response with bins first and orders second."""
    return np.asarray(response.transpose(LAUNCH_SPEED, ORDER, ...).values, dtype=np.float64)
