"""States of observer, body and Sun from SPICE kernels, which are the user's own files."""

import math
from collections.abc import Iterator
from contextlib import contextmanager
from importlib import import_module
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from tracer.errors import InputError
from tracer.observe.planspec.observer import SpicePath
from tracer.observe.planspec.plan import PlanSpec
from tracer.units import si

Floats = NDArray[np.float64]

KILOMETRE = 1e3
INERTIAL = "J2000"
MOST_EXPOSURES = 1_000_000
CLOCK = 1e-3
"""Seconds by which the last exposure may begin late: dynamical time, in which steps are taken, is not quite UTC."""


class SpiceStates(NamedTuple):
    """N states in J2000: `times` as UTC, `observers` and `suns` (N, 3) [m] from the body, orbit `normals` (N, 3).

    `from_frame` (N, 3, 3) turns vectors of the plan's frame into J2000.
    """

    times: NDArray[Any]
    observers: Floats
    suns: Floats
    normals: Floats
    from_frame: Floats


def spice_states(plan: PlanSpec, path: SpicePath) -> SpiceStates:
    """Return the states at the beginning of every exposure; geometric, without light time.

    Raises
    ------
    InputError
        `spiceypy` is not installed, a kernel cannot be read, or the kernels do not hold what is asked of them.
    """
    try:
        spice = import_module("spiceypy")
    except ImportError:
        raise InputError(
            f'{plan.file}: observer.law: "spice" needs the package spiceypy; install the extra: '
            "pip install 'exosphere-tracer[spice]'"
        ) from None
    with _kernels(spice, plan, path):
        try:
            return _states(spice, plan, path)
        except Exception as error:
            if isinstance(error, InputError):
                raise
            raise InputError(f"{plan.file}: observer: SPICE says: {_words(error)}") from None


@contextmanager
def _kernels(spice: Any, plan: PlanSpec, path: SpicePath) -> Iterator[None]:
    """Load the kernels, and unload these and no others at the end."""
    loaded = []
    try:
        for number, kernel in enumerate(path.kernels, 1):
            name = str(plan.folder / kernel)
            try:
                spice.furnsh(name)
            except Exception as error:
                raise InputError(
                    f"{plan.file}: observer.kernels[{number}]: {name}: {_words(error)}"
                ) from None
            loaded.append(name)
        yield
    finally:
        for name in reversed(loaded):
            spice.unload(name)


def _states(spice: Any, plan: PlanSpec, path: SpicePath) -> SpiceStates:
    start, stop = (float(spice.str2et(text)) for text in (path.start, path.stop))
    if not stop >= start:
        raise InputError(
            f'{plan.file}: observer.stop: "{path.stop}" is before start "{path.start}"; must be later'
        )
    step = si(path.step)
    count = math.floor((stop - start + CLOCK) / step) + 1
    if count > MOST_EXPOSURES:
        raise InputError(
            f'{plan.file}: observer.step: "{path.step}" makes {count} exposures; at most {MOST_EXPOSURES} are allowed'
        )
    seconds = start + step * np.arange(count)

    def states(target: str, origin: str) -> Floats:
        return np.array([spice.spkezr(target, et, INERTIAL, "NONE", origin)[0] for et in seconds])

    observers, from_sun = states(path.observer, path.target), states(path.target, path.sun)
    orbiting = from_sun if path.host is None else states(path.host, path.sun)
    normals = np.cross(orbiting[:, :3], orbiting[:, 3:])
    _refuse_turning_normals(plan, path, normals)
    return SpiceStates(
        times=np.array([spice.et2utc(et, "ISOC", 3) for et in seconds]),
        observers=KILOMETRE * observers[:, :3],
        suns=-KILOMETRE * from_sun[:, :3],
        normals=normals,
        from_frame=np.array([spice.pxform(path.frame, INERTIAL, et) for et in seconds]),
    )


def _refuse_turning_normals(plan: PlanSpec, path: SpicePath, normals: Floats) -> None:
    """Refuse an orbit whose north swings round: that of a moon that is faster about its host than the host."""
    if np.any(np.einsum("ni,ni->n", normals, np.broadcast_to(normals[0], normals.shape)) <= 0.0):
        raise InputError(
            f"{plan.file}: observer.target: the way of {path.target} about the Sun turns back on itself, as that of a "
            "moon may; name the planet that it goes about as observer.host"
        )


def _words(error: Exception) -> str:
    """Return what SPICE says, on one line: its short message and the long one."""
    parts = [str(getattr(error, name, "") or "").strip() for name in ("short", "long")]
    text = " ".join(" ".join(part for part in parts if part).split()) or " ".join(str(error).split())
    return text[:300]
