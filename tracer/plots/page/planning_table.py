"""A plan's exposures as a table that can be sorted and filtered."""

import math
from collections.abc import Iterator
from typing import NamedTuple

from tracer.plots.page.markup import Markup, element
from tracer.plots.page.reading import number
from tracer.plots.plan_table import FLAGS, FORBIDDEN, PlanTable
from tracer.plots.reading_units import KILORAYLEIGH

MOST_ROWS = 5000
"""Rows beyond which a table is no longer handy; the plan's file has them all."""
WORDS = ("Command", "Flags")
"""Columns of words, before all figures: what must not be commanded is seen first."""
PLUS_MINUS = " \N{PLUS-MINUS SIGN}\N{NO-BREAK SPACE}"


class Column(NamedTuple):
    """A column of figures: head, column of the plan, that of its error, factor of the unit."""

    head: str
    name: str
    error: str | None = None
    factor: float = 1.0


def planning_table(plan: PlanTable) -> Markup:
    """Return the tools and the table: time, geometry, brightness, signal, flags, and whether it may be commanded."""
    columns = [column for column in _columns(plan) if column.name in plan.columns]
    heads = ["Time", *WORDS, *(column.head for column in columns)]
    head = element("tr", [_head(one) for one in heads])
    rows = [_row(plan, columns, row) for row in range(min(plan.rows, MOST_ROWS))]
    caption = "Exposures; those in a keep-out are marked and must not be commanded"
    if plan.rows > MOST_ROWS:
        caption += f". The first {MOST_ROWS} of {plan.rows}: the plan's file has them all"
    table = element(
        "table",
        element("caption", element("span", caption)),
        element("thead", head),
        element("tbody", rows),
        class_="plan",
    )
    region = element(
        "div",
        table,
        class_="scroll tall",
        tabindex="0",
        role="region",
        aria_label="Planning table, scrolls by itself",
    )
    return Markup(_tools(plan) + region)


def _head(words: str) -> Markup:
    kind = "words" if words in WORDS else False
    return element("th", element("button", words, type="button"), scope="col", class_=kind, data_head=words)


def _tools(plan: PlanTable) -> Markup:
    shown = min(plan.rows, MOST_ROWS)
    return element(
        "div",
        element(
            "label",
            "Filter by words ",
            element("input", type="search", id="filter", placeholder="for example thick"),
        ),
        element("label", element("input", type="checkbox", id="allowed"), " only what may be commanded"),
        element("span", f"{shown} exposures", id="shown", role="status"),
        class_="tools",
    )


def _columns(plan: PlanTable) -> Iterator[Column]:
    yield Column("Tangent altitude (km)", "tangent_altitude_km")
    yield Column("Local time (h)", "tangent_local_time_h")
    yield Column("Sun angle (deg)", "sun_angle_deg")
    yield Column("Phase (deg)", "phase_angle_deg")
    yield Column("Distance (km)", "distance_km")
    for line in plan.lines:
        stem = f"brightness_{line}"
        yield Column(f"{line} (kR)", f"{stem}_rayleigh", f"{stem}_standard_error_rayleigh", KILORAYLEIGH)
    yield Column("Counts", "counts", "counts_standard_error")
    yield Column("Signal to noise", "snr", "snr_standard_error")
    yield Column("Exposure for wanted SNR (s)", "exposure_for_wanted_snr_s")


def _row(plan: PlanTable, columns: list[Column], row: int) -> Markup:
    forbidden = bool(plan.flags(FORBIDDEN)[row])
    flags = [words for name, words in FLAGS.items() if name != FORBIDDEN and plan.flags(name)[row]]
    otherwise = (
        "not to be commanded" if forbidden else "only after flight rules and the instrument team's limits"
    )
    command = str(plan.columns["command"][row]) if "command" in plan.columns else otherwise
    return element(
        "tr",
        element("th", str(plan.columns["time"][row]), scope="row"),
        element("td", command, class_="words"),
        element("td", ", ".join(flags) or "none", class_="words"),
        (_cell(plan, column, row) for column in columns),
        class_="forbidden" if forbidden else False,
    )


def _cell(plan: PlanTable, column: Column, row: int) -> Markup:
    value = float(plan.numbers(column.name)[row]) * column.factor
    error = float(plan.numbers(column.error)[row]) * column.factor if column.error else math.nan
    text = "\N{EN DASH}" if math.isnan(value) else "never" if math.isinf(value) else number(value, 3)
    if error > 0.0 and math.isfinite(value):
        text += PLUS_MINUS + number(error, 2)
    return element("td", text, data_value=repr(value))
