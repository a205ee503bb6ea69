"""What a run needs of memory, and what there is."""

import os
import sys
from collections.abc import Iterator
from contextlib import suppress
from pathlib import Path
from typing import NamedTuple

from tracer.engine.executors.seam import window
from tracer.engine.planning import Plan
from tracer.errors import InputError

if sys.platform != "win32":
    import resource

FLOAT_BYTES = 8
REPLICATE_BYTES = 4
GIGABYTE = 1e9

UNLIMITED = 2**60
"""Control groups say "no limit" by numbers above this."""


class Sizes(NamedTuple):
    """What to expect at the most [bytes]: `memory` beside the program itself, and the product on disk."""

    memory: int
    product: int


def sizes(plan: Plan, workers: int) -> Sizes:
    """Return memory and product size of a run on `workers` threads."""
    layout = plan.work.layout
    releases = len(plan.scene.releases)
    kept = plan.replicates * layout.replicated_size
    product = releases * (2 * layout.size * FLOAT_BYTES + kept * REPLICATE_BYTES)
    folded = releases * (2 * layout.size + kept) * FLOAT_BYTES
    under_way = (window(workers, releases) + 1) * layout.size * FLOAT_BYTES
    # Means, errors and one replicate of a release are turned into the product's units one by one.
    return Sizes(folded + max(under_way, product + 3 * layout.size * FLOAT_BYTES), product)


def refuse_what_does_not_fit(plan: Plan, workers: int, available: int | None = None) -> None:
    """Refuse a run that would not fit into memory, before any work is done for it.

    Parameters
    ----------
    plan : Plan
        The run.
    workers : int
        Threads, or results that arrive side by side.
    available : int, optional
        Memory [bytes]; by default what the system says that there is.

    Raises
    ------
    InputError
        Where the run needs more than is available.
    """
    needed = sizes(plan, workers).memory
    there = available_memory() if available is None else available
    if there is not None and needed > there:
        bins = "speed bins, " if plan.scene.speed_bins else ""
        raise InputError(
            f"{plan.spec.file}: the run needs about {needed / GIGABYTE:.3g} GB of memory, {there / GIGABYTE:.3g} GB is "
            f"available; ask for fewer cells, pixels, {bins}replicates or workers"
        )


def available_memory() -> int | None:
    """Return the memory [bytes] that this process can still get, None where nobody says."""
    return min((*_of_the_machine(), *_of_the_control_group(), *_of_the_process()), default=None)


def _of_the_machine() -> Iterator[int]:
    with suppress(OSError, ValueError, IndexError):
        for line in Path("/proc/meminfo").read_text(encoding="ascii").splitlines():
            if line.startswith("MemAvailable:"):
                yield 1024 * int(line.split()[1])
                return
    with suppress(OSError, ValueError, AttributeError):
        yield os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES")


def _of_the_control_group() -> Iterator[int]:
    for limit, use in (
        ("/sys/fs/cgroup/memory.max", "/sys/fs/cgroup/memory.current"),
        ("/sys/fs/cgroup/memory/memory.limit_in_bytes", "/sys/fs/cgroup/memory/memory.usage_in_bytes"),
    ):
        # The word "max" stands for no limit and is no number.
        with suppress(OSError, ValueError):
            most = int(Path(limit).read_text(encoding="ascii"))
            if most < UNLIMITED:
                yield max(0, most - int(Path(use).read_text(encoding="ascii")))


def _of_the_process() -> Iterator[int]:
    if sys.platform == "win32":
        return
    limit, _ = resource.getrlimit(resource.RLIMIT_AS)
    if limit != resource.RLIM_INFINITY:
        with suppress(OSError, ValueError, IndexError):
            pages = int(Path("/proc/self/statm").read_text(encoding="ascii").split()[0])
            yield max(0, limit - pages * resource.getpagesize())
