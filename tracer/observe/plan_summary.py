"""What a planned observation comes to: how many exposures may be asked for, and the best windows."""

from typing import NamedTuple

import numpy as np
from astropy.table import Table
from numpy.typing import NDArray

WINDOWS = 5
"""Windows that a summary names."""


class Window(NamedTuple):
    """Exposures `first` to `last`, rows from 0, one after another.

    `best_snr` of a single exposure; `total_snr` of all together, whose squares add.
    """

    first: int
    last: int
    best_snr: float
    total_snr: float


class PlanSummary(NamedTuple):
    """Counts of rows of a plan's table.

    `usable` rows have no keep-out, no body in the field, no saturation, and gas of the grid; `reaching` of them have
    the wanted ratio. `windows` are runs of usable rows that reach it, the best first; of any usable rows where none
    does.
    """

    exposures: int
    forbidden: int
    usable: int
    reaching: int
    flagged: dict[str, int]
    windows: tuple[Window, ...]


FLAGS = ("sun_keep_out", "body_keep_out", "body_in_field", "saturated", "outside_grid", "thick")
SPOILING = ("do_not_command", "body_in_field", "saturated", "outside_grid")


def summarize(table: Table, wanted_snr: float) -> PlanSummary:
    """Return the summary of a table of `plan_observation`, for the signal-to-noise ratio `wanted_snr`."""
    usable = ~np.any([np.asarray(table[name]) for name in SPOILING], axis=0)
    snr = np.asarray(table["snr"])
    reaching = usable & (snr >= wanted_snr)
    windows = [_window(run, snr) for run in _runs(reaching if reaching.any() else usable)]
    windows.sort(key=lambda window: -window.total_snr)
    return PlanSummary(
        exposures=len(table),
        forbidden=int(np.sum(table["do_not_command"])),
        usable=int(usable.sum()),
        reaching=int(reaching.sum()),
        flagged={name: int(np.sum(table[name])) for name in FLAGS},
        windows=tuple(windows[:WINDOWS]),
    )


def _runs(good: NDArray[np.bool_]) -> list[tuple[int, int]]:
    """Return the first and last rows of every run of good rows."""
    steps = np.diff(np.concatenate([[False], good, [False]]).astype(int))
    return list(
        zip(np.flatnonzero(steps == 1).tolist(), (np.flatnonzero(steps == -1) - 1).tolist(), strict=True)
    )


def _window(run: tuple[int, int], snr: NDArray[np.float64]) -> Window:
    ratios = snr[run[0] : run[1] + 1]
    return Window(run[0], run[1], float(ratios.max()), float(np.sqrt(np.sum(ratios**2))))
