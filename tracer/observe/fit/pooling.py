"""Releases of several products put together: what they must have in common, and what they are called."""

from collections.abc import Sequence
from pathlib import Path

import xarray as xr

from tracer.errors import InputError
from tracer.observe.fit.sources import Source
from tracer.product.batch_ranges import SeedRange, parse_ranges
from tracer.product.run_file import differing_keys

SAME = ("body", "sun", "gas")
"""Tables of the run file in which pooled products must agree: where and what the gas is, and its light."""
NAMED = ("surface", "domain")
"""Tables whose differences are named: what happens to atoms after their release."""


def check_alike(products: Sequence[tuple[str, xr.Dataset]]) -> list[str]:
    """Return what is to be said of products whose releases are pooled.

    Raises
    ------
    InputError
        Products of other bodies, Suns or gases, with the keys in which they differ.
    """
    first_name, first = products[0]
    words = []
    for name, ds in products[1:]:
        keys = differing_keys(str(first.attrs.get("run_file", "")), str(ds.attrs.get("run_file", "")))
        wrong = [key for key in keys if key.split(".")[0].split("[")[0] in SAME]
        if float(first.attrs["body_radius"]) != float(ds.attrs["body_radius"]) and not wrong:
            wrong = ["body.radius"]
        if wrong:
            raise InputError(
                f"{name}: cannot be pooled with {first_name}: they differ in {', '.join(wrong)}; body, sun and gas "
                "must be the same"
            )
        named = [key for key in keys if key.split(".")[0] in NAMED]
        if named:
            words.append(
                f"{name} and {first_name} differ in {', '.join(named)}; one ground and domain would be physical"
            )
        if _share_batches(first, ds):
            words.append(
                f"{name} and {first_name} have the same seed: their Monte Carlo errors are not independent, as the "
                "ranges take them to be; run one of them with another ensemble.seed"
            )
    return words


def _share_batches(one: xr.Dataset, other: xr.Dataset) -> bool:
    """Return whether two products launch with some of the same random numbers."""
    return any(
        a.seed == b.seed and a.first < b.stop and b.first < a.stop
        for a in _batches(one)
        for b in _batches(other)
    )


def _batches(ds: xr.Dataset) -> list[SeedRange]:
    try:
        return parse_ranges(str(ds.attrs.get("batch_ranges", "")))
    except ValueError:
        return []


def with_own_names(sources: Sequence[Source]) -> list[Source]:
    """Return the sources, those whose name another product has as well with their product's behind it."""
    names = [one.name for one in sources]
    called = [
        one._replace(name=f"{one.name} ({Path(one.product).name})") if names.count(one.name) > 1 else one
        for one in sources
    ]
    known = [one.name for one in called]
    twice = next((name for name in known if known.count(name) > 1), None)
    if twice is not None:
        raise InputError(f'two products give the release "{twice}"; give their files different names')
    return called
