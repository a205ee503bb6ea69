"""Figure: what share of the atoms ends how, against what varies."""

from collections.abc import Sequence

import numpy as np
import xarray as xr
from matplotlib.figure import Figure

from tracer.errors import InputError
from tracer.plots.budget import look
from tracer.plots.curves import Curve
from tracer.plots.field import Field, listed, released_words, releases
from tracer.plots.style import FLUX_COLOURS, Width
from tracer.plots.swept.axes import points_of
from tracer.plots.swept.drawing import Line, Words, family_lines, lines_figure, map_figure
from tracer.product.layout import FATE, RELEASE, STANDARD_ERROR
from tracer.product.sweep_layout import swept_dimensions

PER_CENT = 100.0
ESCAPED = "escaped"


def swept_ledger(
    sweep: xr.Dataset, release: str | None = None, fate: str | None = None, width: Width = "full"
) -> Figure:
    """Return the shares of fates against what varies; one fate where two dimensions do.

    Parameters
    ----------
    sweep : xarray.Dataset
        As `open_sweep` gives it.
    release : str, optional
        The release to draw; the sum over all if absent.
    fate : str, optional
        The fate to draw; all of them if absent, or "escaped" where two dimensions vary.
    width : "column" or "full"
        Width of the figure, of one column or the whole page of a journal.

    Raises
    ------
    InputError
        No such release or fate, or more than two swept dimensions.
    """
    names, points = releases(sweep, release), points_of(sweep)
    known = [str(name) for name in sweep["fate_name"].values]
    if fate is not None and fate not in known:
        raise InputError(f'there is no fate "{fate}"; allowed: {listed(known)}')
    rates, errors = _rates(sweep, names)
    places = points.numbers - 1
    shares = Field(*(PER_CENT * (one / rates.sum(axis=1, keepdims=True))[places] for one in (rates, errors)))
    label = "Share of released atoms (%)"
    if points.family is not None or fate is not None:
        number = known.index(fate or ESCAPED)
        one = Field(shares.value[..., number], shares.error[..., number])
        words = Words(f"Share of atoms {look(known[number]).words}, {released_words(names)}", label, "")
        if points.as_map:
            return map_figure(sweep, points, one, words, FLUX_COLOURS, width)
        return lines_figure(sweep, points, family_lines(points, one), words, width)
    lines = _fate_lines(known, Field(shares.value[0], shares.error[0]))
    return lines_figure(
        sweep, points, lines, Words(f"Particle budget, {released_words(names)}", label, ""), width
    )


def _rates(sweep: xr.Dataset, names: Sequence[str]) -> tuple[np.ndarray, np.ndarray]:
    """Return rates by point and fate [s-1] with their errors; releases are independent, their variances add."""
    order = (*swept_dimensions(sweep.attrs), RELEASE, FATE)
    chosen = sweep[["ledger", "ledger" + STANDARD_ERROR]].sel(release=list(names)).transpose(*order)
    rate, error = chosen["ledger"].values, np.nan_to_num(chosen["ledger" + STANDARD_ERROR].values)
    fates = rate.shape[-1]
    return rate.sum(axis=-2).reshape(-1, fates), np.hypot.reduce(error, axis=-2).reshape(-1, fates)


def _fate_lines(fates: Sequence[str], shares: Field) -> list[Line]:
    lines = []
    for number, name in enumerate(fates):
        shown = look(name)
        one = Field(shares.value[:, number], shares.error[:, number])
        if one.hit.any():
            lines.append(Line(Curve(shown.words, shown.colour, "-", 0.9), shown.marker, one))
    return lines
