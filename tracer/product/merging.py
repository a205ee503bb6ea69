"""Products of one scene put together, as one run would have made them; nothing is held but a chunk at a time."""

import hashlib
from collections.abc import Mapping, Sequence
from itertools import pairwise
from typing import Any, NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.product.assembling import with_label_indexes, without_label_indexes
from tracer.product.batch_ranges import SeedRange, parse_ranges, ranges_text
from tracer.product.checksum import data_checksum
from tracer.product.layout import REPLICATE, REPLICATES, STANDARD_ERROR, Ratio, layout, resolved_images
from tracer.product.lazy import Key, lazy_variable
from tracer.product.merging_ratios import merged_ratio
from tracer.product.provenance import global_attributes
from tracer.product.run_file import differing_keys, replicates_wanted
from tracer.product.slabs import slabs
from tracer.tally.combining import Part, Replicates, batches_of, combined_error, combined_mean, regrouped

SUMMED = ("flights", "integration_steps", "kernel_seconds", "wall_seconds")
BEYOND = "share_beyond_line_tables"
OLDER = "share_older_than_age_limit"
GROUPS = "replicate_batches"
"""Attribute: how many batches count into each replicate."""


class Share(NamedTuple):
    """One product that is put together with others."""

    name: str
    ds: xr.Dataset
    ranges: list[SeedRange]

    @property
    def batches(self) -> int:
        """Number of its batches."""
        return sum(one.stop - one.first for one in self.ranges)


def merged_product(products: Sequence[tuple[str, xr.Dataset]]) -> xr.Dataset:
    """Return the product of all batches of all products.

    Means agree with those of one run over the same batches to rounding, errors as well. Replicates are single
    precision in the products, and so are the merged ones; `tracer.tally.combining.regrouped` says how they are grouped.

    Parameters
    ----------
    products : sequence of (str, Dataset)
        Name and product, as `open_product` gives it, at least one. They must stay open while the result is read.

    Returns
    -------
    xarray.Dataset
        Lazy: each value is computed when it is read.

    Raises
    ------
    InputError
        Other scenes, versions or particles per batch, the same batches twice, or a product whose data do not match its
        checksum.
    """
    shares = sorted((_share(name, ds) for name, ds in products), key=lambda share: share.ranges)
    for share in shares[1:]:
        _check_alike(shares[0], share)
    _check_apart(shares)
    for share in shares:
        _check_whole(share)
    parts = _regrouped(shares)
    stored = [without_label_indexes(share.ds) for share in shares]
    ratios = _ratios(stored[0])
    variables = {
        str(name): _merged(str(name), stored, shares, parts, ratios)
        for name in stored[0].variables
        if parts or not str(name).endswith(REPLICATES)
    }
    coordinates = {name: variables[name] for name in map(str, stored[0].coords)}
    fields = {name: variable for name, variable in variables.items() if name not in coordinates}
    return with_label_indexes(xr.Dataset(fields, coordinates, _attributes(shares, parts)))


def _share(name: str, ds: xr.Dataset) -> Share:
    try:
        ranges = parse_ranges(str(ds.attrs["batch_ranges"]))
    except (KeyError, ValueError):
        raise InputError(f"{name}: does not say which batches it holds; it cannot be merged") from None
    share = Share(name, ds, ranges)
    if share.batches != ds.attrs["batches"] or len(_groups(ds)) != ds.sizes.get(REPLICATE, 0):
        raise InputError(f"{name}: contradicts itself about its batches; it cannot be merged")
    return share


def _check_alike(first: Share, other: Share) -> None:
    ours, theirs = first.ds.attrs, other.ds.attrs
    if ours["source"] != theirs["source"]:
        raise InputError(
            f"{other.name}: made by {theirs['source']}, {first.name} by {ours['source']}; "
            "only products of one version can be merged"
        )
    if ours["scene_hash"] != theirs["scene_hash"]:
        keys = differing_keys(ours["run_file"], theirs["run_file"])
        where = ", ".join(keys) if keys else "a file that the run files refer to, or the catalogue"
        raise InputError(f"{other.name}: is of another scene than {first.name}; they differ in {where}")
    if ours["particles_per_batch"] != theirs["particles_per_batch"]:
        raise InputError(
            f"{other.name}: has {theirs['particles_per_batch']} particles per batch, {first.name} "
            f"{ours['particles_per_batch']}; only batches of one size can be merged"
        )
    if _without_replicates(first.ds) != _without_replicates(other.ds):
        raise InputError(f"{other.name}: has other variables than {first.name}")


def _without_replicates(ds: xr.Dataset) -> set[str]:
    return {str(name) for name in ds.variables if not str(name).endswith(REPLICATES)}


def _check_apart(shares: Sequence[Share]) -> None:
    ranges = sorted((one, share.name) for share in shares for one in share.ranges)
    for (before, first), (after, second) in pairwise(ranges):
        if before.seed == after.seed and after.first < before.stop:
            twice = after._replace(stop=min(before.stop, after.stop))
            raise InputError(f"{second}: {twice} are in {first} already; no batch counts twice")


def _check_whole(share: Share) -> None:
    try:
        found = data_checksum(share.ds)
    except (OSError, RuntimeError) as error:
        raise InputError(f"{share.name}: is damaged and cannot be read ({error})") from None
    if found != share.ds.attrs.get("data_checksum"):
        raise InputError(
            f"{share.name}: its data do not match its data_checksum; the file was changed or damaged"
        )


def _regrouped(shares: Sequence[Share]) -> list[list[Part]]:
    wanted = max(replicates_wanted(share.ds.attrs["run_file"]) for share in shares)
    return regrouped(
        [_replicates(share) for share in shares], min(wanted, sum(one.batches for one in shares))
    )


def _replicates(share: Share) -> Replicates:
    counts = _groups(share.ds)
    single = len(share.ranges) == 1 and len(counts) == share.batches
    first = share.ranges[0].first
    # Batch b counts into replicate b modulo their number, which here is that of the batches.
    numbers = [first + (group - first) % len(counts) for group in range(len(counts))] if single else []
    return Replicates(counts, tuple(numbers))


def _groups(ds: xr.Dataset) -> tuple[int, ...]:
    # A file gives an attribute of one number back as a number.
    return tuple(int(count) for count in np.atleast_1d(ds.attrs.get(GROUPS, ())))


def _ratios(ds: xr.Dataset) -> dict[str, Ratio]:
    """Return the variables that are ratios, with their errors and replicates, and what belongs to each."""
    images = resolved_images(ds.dims)
    rows = {name: row.ratio for name, row in layout(images, True, images).items() if row.ratio is not None}
    return {name + end: ratio for name, ratio in rows.items() for end in ("", STANDARD_ERROR, REPLICATES)}


def _merged(
    name: str,
    stored: Sequence[xr.Dataset],
    shares: Sequence[Share],
    parts: list[list[Part]],
    ratios: Mapping[str, Ratio],
) -> xr.Variable:
    variables = [ds.variables[name] for ds in stored]
    first = variables[0]
    batches = [share.batches for share in shares]
    if name in ratios:
        return merged_ratio(name, ratios[name], stored, batches, parts)
    base = name.removesuffix(STANDARD_ERROR)

    def read_all(sources: Sequence[xr.Variable], key: Key) -> list[NDArray[Any]]:
        return [np.asarray(source[key].values) for source in sources]

    shape = first.shape
    if name.endswith(REPLICATES):
        shape = (len(parts), *first.shape[1:])

        def read(key: Key) -> NDArray[Any]:
            return _read_replicates(variables, parts, key)

    elif base != name and base in stored[0].variables:
        means = [ds.variables[base] for ds in stored]

        def read(key: Key) -> NDArray[Any]:
            return combined_error(read_all(means, key), read_all(variables, key), batches)

    elif name + STANDARD_ERROR in stored[0].variables:

        def read(key: Key) -> NDArray[Any]:
            return combined_mean(read_all(variables, key), batches)

    else:
        _check_equal(name, variables, shares)
        return first
    return lazy_variable(first.dims, shape, first.dtype, read, first.attrs)


def _read_replicates(
    variables: Sequence[xr.Variable], parts: list[list[Part]], key: Key
) -> NDArray[np.float32]:
    chosen, rest = key[0], key[1:]
    rows = []
    for group in parts[chosen] if isinstance(chosen, slice) else [parts[chosen]]:
        values = [np.asarray(variables[part.share][(part.group, *rest)].values, np.float64) for part in group]
        rows.append(
            sum(one * part.batches for one, part in zip(values, group, strict=True)) / batches_of(group)
        )
    return np.asarray(rows if isinstance(chosen, slice) else rows[0], np.float32)


def _check_equal(name: str, variables: Sequence[xr.Variable], shares: Sequence[Share]) -> None:
    first = variables[0]
    for share, other in zip(shares[1:], variables[1:], strict=True):
        same = first.dims == other.dims and first.shape == other.shape
        places = slabs(first.shape, first.dtype.itemsize) if same else ()
        if not same or not all(_equal(first[place], other[place]) for place in places):
            raise InputError(f"{share.name}: its {name} is not that of {shares[0].name}")


def _equal(one: xr.Variable, other: xr.Variable) -> bool:
    numbers = one.dtype.kind == "f" and other.dtype.kind == "f"
    return bool(np.array_equal(one.values, other.values, equal_nan=numbers))


def _attributes(shares: Sequence[Share], parts: list[list[Part]]) -> dict[str, Any]:
    kept = shares[0].ds.attrs
    seeds = sorted({one.seed for share in shares for one in share.ranges})
    names = ", ".join(share.name for share in shares)
    made = global_attributes(str(kept["title"]), f"merged from {names}")
    merged = {
        **{key: value for key, value in kept.items() if not key.startswith("stop_")},
        **{key: made[key] for key in ("history", "created")},
        "history": f"{made['history']}\n{kept['history']}",
        "run_hash": _run_hash([str(share.ds.attrs["run_hash"]) for share in shares]),
        "seed": seeds[0] if len(seeds) == 1 else np.array(seeds),
        "batches": sum(share.batches for share in shares),
        "batch_ranges": ranges_text(one for share in shares for one in share.ranges),
        "workers": max(int(share.ds.attrs["workers"]) for share in shares),
        **{key: sum(share.ds.attrs[key] for share in shares) for key in SUMMED},
        **_beyond(shares),
        **_older(shares),
        GROUPS: np.array([batches_of(group) for group in parts], dtype=np.int64),
    }
    # An attribute without a number cannot be written.
    return merged if parts else {key: value for key, value in merged.items() if key != GROUPS}


def _run_hash(hashes: Sequence[str]) -> str:
    """Return the hash that all have in common, or one of all hashes, whatever their order."""
    different = sorted(set(hashes))
    return different[0] if len(different) == 1 else hashlib.sha256("|".join(different).encode()).hexdigest()


def _beyond(shares: Sequence[Share]) -> dict[str, Any]:
    """Return the share of survival time beyond the lines' tables, weighted with the survival time itself."""
    if BEYOND not in shares[0].ds.attrs:
        return {}
    lives = np.array([share.ds["mean_life"].values * share.batches for share in shares])
    each = np.array([np.atleast_1d(share.ds.attrs[BEYOND]) for share in shares])
    return {BEYOND: (lives * each).sum(axis=0) / lives.sum(axis=0)}


def _older(shares: Sequence[Share]) -> dict[str, Any]:
    """Return the share of survival time behind the limit of age, beside the time up to it, which `mean_life` is."""
    if OLDER not in shares[0].ds.attrs:
        return {}
    lives = np.array([share.ds["mean_life"].values * share.batches for share in shares])
    each = np.array([np.atleast_1d(share.ds.attrs[OLDER]) for share in shares])
    older = (lives * each / (1.0 - each)).sum(axis=0)
    return {OLDER: older / (lives.sum(axis=0) + older)}
