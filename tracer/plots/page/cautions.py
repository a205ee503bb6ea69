"""What a reader must know first, what to watch in this product, and what the model leaves out."""

from collections.abc import Iterator

import numpy as np
import xarray as xr

from tracer.catalogue.load import bodies
from tracer.physics.retention import HYDRODYNAMIC_JEANS
from tracer.plots.budget import budget_of
from tracer.plots.field import releases, variable
from tracer.plots.moving import older_worth_a_caution
from tracer.plots.page.reading import number, percent
from tracer.plots.page.scene_words import release_jeans
from tracer.plots.plan_table import FORBIDDEN, PlanTable
from tracer.plots.run_text import run_tables
from tracer.plots.sums import has_replicates
from tracer.product.layout import LINE
from tracer.product.outside_velocity import outside_notes
from tracer.product.run_file import Table, entries, table

FIRST = (
    "A planning aid, not a flight product. Flight rules, keep-out angles, detector limits and the decisions of the "
    "responsible team come first, and so does their licensed practice.",
    "Densities, columns and brightness decide nothing alone about where a spacecraft points or flies, or what a "
    "detector is exposed to. Check a result that matters with a second seed, more particles and an independent "
    "estimate.",
    "Error bars are those of the Monte Carlo sampling. They say nothing about release rates, temperatures, sticking "
    "and photo-rates, which are usually known to a factor, not to a per cent.",
)
NOTABLE = 0.01
"""Share of atoms alive at the age limit that is worth a word."""


def plan_cautions(product: xr.Dataset, plan: PlanTable) -> Iterator[str]:
    """Yield what a plan's reader must know."""
    forbidden = int(plan.flags(FORBIDDEN).sum())
    if forbidden:
        yield (
            f"{forbidden} of {plan.rows} planned exposures lie inside a keep-out and must not be commanded; they are "
            "marked in the planning table."
        )
    yield plan.notes.get(
        "caution", "A plan is no command sequence: the limits of the instrument team come first."
    )
    made_from = plan.notes.get("product_scene_hash")
    if made_from is None:
        yield "The plan's file does not tell from which product it was made; check that it was this one."
    elif made_from != product.attrs.get("scene_hash"):
        yield "The plan was made from another scene than this product: its numbers do not belong to these figures."


def watch(product: xr.Dataset) -> Iterator[str]:
    """Yield what limits this very product."""
    budget = budget_of(product, releases(product, None))
    total = budget.rate[-1].sum()
    shares = dict(zip(budget.fates, budget.rate[-1] / total, strict=True)) if total > 0.0 else {}
    if shares.get("unresolved", 0.0) > 0.0:
        yield f"{percent(shares['unresolved'])} of the atoms were given up by the propagator: use no part of this."
    if shares.get("age_limit", 0.0) > NOTABLE:
        yield f"{percent(shares['age_limit'])} of the atoms outlived the age limit: what came later is missing."
    older = older_worth_a_caution(product)
    if older is not None:
        yield (
            f"Up to {percent(older)} of the survival time lies behind the age limit: about that much of the gas at the "
            "stated position, mostly far away, is missing."
        )
    if not has_replicates(product, "number_density"):
        yield "There are no replicates: errors of sums over cells, fields of view and fits are not to be had."
    if product.attrs.get("stop_reached", 1) == 0:
        yield "The run ended before it reached the relative error that was asked for."
    beyond = float(np.max(product.attrs.get("share_beyond_line_tables", 0.0)))
    if beyond > 0.0:
        yield (
            f"Up to {percent(beyond)} of the time in flight was at radial velocities beyond the tables of g, where "
            "the value at the end of the table stands."
        )
    for text in outside_notes(product):
        yield f"{text[0].upper()}{text[1:]}."
    yield from _jeans(product)
    yield from _poor_cells(product)


def _jeans(product: xr.Dataset) -> Iterator[str]:
    run, radius = run_tables(product), float(product.attrs.get("body_radius", "nan"))
    for entry in entries(run, "release"):
        jeans = release_jeans(run, entry, radius)
        if jeans is not None and jeans < HYDRODYNAMIC_JEANS:
            yield (
                f"Release \N{LEFT DOUBLE QUOTATION MARK}{entry.get('name')}\N{RIGHT DOUBLE QUOTATION MARK} has a jeans "
                f"parameter of {number(jeans, 3)}: a dense gas would flow out as a whole, which this model does not do."
            )


def _poor_cells(product: xr.Dataset) -> Iterator[str]:
    field = variable(product, "number_density", releases(product, None), 1.0)
    if field.hit.any():
        poor = 1.0 - float(field.significant.sum()) / float(field.hit.size)
        if poor > 0.0:
            yield (
                f"{percent(poor)} of the cells of number density say nothing: never hit, or known no better than to "
                "half of their value. Figures hatch them."
            )


def left_out(product: xr.Dataset) -> Iterator[str]:
    """Yield what the model leaves out, as far as it touches this scene."""
    run = run_tables(product)
    yield (
        "Atoms never meet: nothing about a gas with a jeans parameter below about 3, which flows out as a whole, nor "
        "about an atmosphere thick enough to have a barometer."
    )
    yield from _of_sunlight(run, LINE in product.dims)
    yield from _of_the_host(run)
    yield from _of_the_ground(run)
    yield "No charged particles, no magnetic or electric fields, no chemistry. What is ionised is gone."


def _of_sunlight(run: Table, shines: bool) -> Iterator[str]:
    if "sun" not in run:
        yield "There is no Sun in this scene: no push, no tide, no light, no shadow, no loss to sunlight."
        return
    if shines:
        yield (
            "Sunlight is single scattering into all directions alike: no phase function, no optical depth, no "
            "hyperfine structure. A line without known g neither pushes nor shines."
        )
    else:
        yield "No line of this gas has a known g here: nothing about its brightness, and no line pushes it."
    if table(run, "sun").get("motion", "stationary") == "stationary":
        yield "The body stands still on its orbit while atoms fly: no seasons within a tail that is weeks long."
    else:
        yield (
            "Along the orbit only distance, velocity, the turning of the frame and the rates that ask for it change: "
            "temperatures and the laws of release stay those of the run file."
        )


def _of_the_host(run: Table) -> Iterator[str]:
    body = table(run, "body")
    if "host" in body:
        yield (
            "The moon's orbit is a circle, but for an epoch in the plane of its host's orbit about the Sun; the host "
            "has no atmosphere that bends light into its shadow, and no magnetosphere."
        )
        if "sun" in run and table(run, "sun").get("motion", "stationary") == "stationary":
            yield (
                "The host keeps its place, and the Sun's direction turns along with it: the older an atom, the more "
                "its sunlight and shadow came from elsewhere."
            )
        return
    known = bodies().get(str(body.get("name")))
    if known is not None and known.host.orbit is not None:
        host = known.host.name
        if "sun" in run:
            yield f"The gravity and shadow of {host}, and the body's own motion about it."
        else:
            yield f"The gravity of {host}, and the body's own motion about it."
    elif known is None and "orbit" not in body:
        yield "Should the body be a moon: the gravity and shadow of its host planet, and its own motion about it."


TEMPERATURES = {
    "uniform": "the ground has one temperature everywhere",
    "map": "temperatures are those of a map, whatever the distance from the Sun",
    "conduction": "temperatures are those of a steady rhythm of day and night under the mean motion of the Sun",
    "hurley-2015": "temperatures are a fit of the Moon's to the Sun's height and the time of night",
}


def _of_the_ground(run: Table) -> Iterator[str]:
    surface = table(run, "surface")
    sphere = "A smooth sphere: no topography, no porosity"
    ground = table(surface, "temperature")
    if ground:
        law = TEMPERATURES.get(str(ground.get("law")), "temperature follows a simple law of the Sun's height")
        sphere += f"; {law}"
    yield sphere + "."
    if surface.get("sticking", 0.0) != 0.0:
        if surface.get("adsorbed", "captured") == "captured":
            yield "Atoms that stick are captured for good; none leaves again later."
        else:
            yield (
                "Atoms at rest have one energy of desorption: no spread of it, no diffusion into the ground, no "
                "burial; they do not cover each other's places."
            )
    placed = [str(table(entry, "place").get("law")) for entry in entries(run, "release")]
    if table(surface, "cold_traps") or "map" in placed or ground.get("law") == "map":
        yield "Cold traps and maps stand still below the Sun while the ground turns."
