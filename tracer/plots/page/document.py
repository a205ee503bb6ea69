"""The page put together: one HTML file that needs nothing beside it."""

import base64
import hashlib
import importlib.metadata
import platform
from collections.abc import Iterator, Sequence
from importlib.resources import files
from typing import NamedTuple

import xarray as xr

from tracer.plots.budget import budget_of, look
from tracer.plots.field import releases
from tracer.plots.moving import motion_of, time_words
from tracer.plots.page.cautions import FIRST, left_out, plan_cautions, watch
from tracer.plots.page.figure_list import PageFigure, plan_figure, product_figures
from tracer.plots.page.markup import Content, Markup, bullets, definitions, element, table
from tracer.plots.page.planning_table import planning_table
from tracer.plots.page.reading import duration, number, percent
from tracer.plots.page.scene_words import scene_words
from tracer.plots.plan_table import PlanTable
from tracer.plots.saving import figure_bytes

DOTS_PER_INCH = 170
NARROW_SCREEN = "(max-width: 40rem)"
"""Screens that get the figures of one column."""
UNTITLED = "Untitled product"
PACKAGES = ("exosphere-tracer", "numpy", "xarray", "matplotlib")
TOLD = (
    "source",
    "git_commit",
    "created",
    "history",
    "product_version",
    "Conventions",
    "scene_hash",
    "run_hash",
    "data_checksum",
    "seed",
    "batches",
    "batch_ranges",
    "particles_per_batch",
    "flights",
    "integration_steps",
    "kernel_seconds",
    "wall_seconds",
    "workers",
    "references",
)
"""Attributes of a product that tell where it comes from."""


def report_page(product: xr.Dataset, name: str, plan: PlanTable | None = None, plan_name: str = "") -> str:
    """Return a product, and a plan where there is one, as one HTML page without any reference to the network.

    Equal products give equal pages, on the same packages.

    Parameters
    ----------
    product : xarray.Dataset
        As `open_product` gives it.
    name : str
        Of the product's file.
    plan : PlanTable, optional
        What `tracer plan` made of the product.
    plan_name : str
        Of the plan's file.

    Raises
    ------
    InputError
        Where the product lacks what its figures need.
    """
    title = str(product.attrs.get("title", "")).strip() or UNTITLED
    sections = [
        _section("scene", "Scene", definitions(scene_words(product))),
        _section("meaning", "What the numbers mean", definitions(time_words(product))),
        _section("budget", "Particle budget", _budget(product)),
        _section("figures", "Figures", [_figure(one) for one in product_figures(product)]),
    ]
    if plan is not None:
        sections.append(
            _section("plan", "Planned observation", [_figure(plan_figure(plan)), planning_table(plan)])
        )
    sections += [
        _section("left-out", "What the model leaves out", bullets(left_out(product))),
        _section("provenance", "Provenance", _provenance(product, name, plan, plan_name)),
    ]
    links = [("cautions", "Cautions"), *((one.name, one.heading) for one in sections)]
    body = element(
        "body",
        element("a", "Skip the contents", class_="skip", href="#cautions"),
        element("header", element("h1", title), element("p", _lead(product), class_="lead")),
        element(
            "nav",
            element("ul", [element("li", element("a", text, href=f"#{name}")) for name, text in links]),
            aria_label="Contents",
        ),
        element("main", _cautions(product, plan), [one.content for one in sections]),
        _viewer(),
        Markup(f"<script>{_asset('page.js')}</script>"),
    )
    return f"<!DOCTYPE html>\n{element('html', _head(title), body, lang='en')}\n"


class Section(NamedTuple):
    """A part of the page: its name for links, its heading, and all of it."""

    name: str
    heading: str
    content: Markup


def _section(name: str, heading: str, content: Content) -> Section:
    return Section(name, heading, element("section", element("h2", heading), content, id=name))


def _head(title: str) -> Markup:
    style, script = _asset("page.css"), _asset("page.js")
    # Nothing is loaded, and no script runs but the page's own: not even one that came with a text.
    policy = (
        f"default-src 'none'; img-src data:; style-src '{_digest(style)}'; script-src '{_digest(script)}'; "
        "base-uri 'none'; form-action 'none'"
    )
    return element(
        "head",
        element("meta", charset="utf-8"),
        element("meta", http_equiv="Content-Security-Policy", content=policy),
        element("meta", name="viewport", content="width=device-width, initial-scale=1"),
        element("meta", name="referrer", content="no-referrer"),
        element("title", f"{title} \N{EN DASH} exosphere product"),
        Markup(f"<style>{style}</style>"),
    )


def _asset(name: str) -> str:
    return files("tracer.plots.page").joinpath("assets", name).read_text(encoding="utf-8")


def _digest(text: str) -> str:
    return "sha256-" + base64.b64encode(hashlib.sha256(text.encode("utf-8")).digest()).decode("ascii")


def _lead(product: xr.Dataset) -> str:
    created = product.attrs.get("created")
    made = f", traced {created}" if created else ""
    return f"A Monte Carlo model of a surface-bound exosphere{made}."


def _cautions(product: xr.Dataset, plan: PlanTable | None) -> Markup:
    first, *others = FIRST
    points = [*(plan_cautions(product, plan) if plan is not None else ()), *others, *watch(product)]
    return element(
        "section",
        element("h2", "Cautions"),
        element("p", first),
        bullets(points),
        id="cautions",
        class_="caution",
    )


def _budget(product: xr.Dataset) -> Content:
    names = releases(product, None)
    budget = budget_of(product, names)
    heads = [
        "Release",
        "Atoms per second",
        *(look(fate).words for fate in budget.fates),
        "Mean life",
        "Mean flights",
    ]
    rows: list[list[Content]] = []
    for place, name in enumerate(budget.names):
        total = float(budget.rate[place].sum())
        shares = [
            percent(float(rate) / total, float(error) / total) if total > 0.0 else "\N{EN DASH}"
            for rate, error in zip(budget.rate[place], budget.error[place], strict=True)
        ]
        rows.append([name, number(total), *shares, *_lives(product, name if place < len(names) else None)])
    released = (
        "the released atoms" if motion_of(product) is None else "the atoms released at the stated position"
    )
    return [
        table(heads, rows, f"What becomes of {released}: shares with one standard error"),
        element(
            "p",
            "Releases are independent: the variances of their rates add. Everything scales with the rates.",
        ),
    ]


def _lives(product: xr.Dataset, name: str | None) -> list[str]:
    if name is None:
        return ["", ""]
    one = product[["mean_life", "mean_flights"]].sel(release=name)
    return [duration(float(one["mean_life"])), number(float(one["mean_flights"]))]


def _figure(one: PageFigure) -> Markup:
    wide, narrow = (_picture(one, width) for width in ("full", "column"))
    picture = element(
        "picture",
        element("source", media=NARROW_SCREEN, srcset=narrow),
        element("img", src=wide, alt=one.alternative),
    )
    return element(
        "figure",
        element("h3", one.heading),
        element("button", picture, type="button", class_="zoom", aria_label=f"Enlarge: {one.heading}"),
        element("figcaption", one.alternative),
        id=one.name,
    )


def _picture(one: PageFigure, width: str) -> str:
    figure = one.draw("column" if width == "column" else "full")
    return "data:image/png;base64," + base64.b64encode(figure_bytes(figure, ".png", DOTS_PER_INCH)).decode(
        "ascii"
    )


def _viewer() -> Markup:
    buttons = [
        element("button", text, type="button", class_=kind, aria_label=words)
        for kind, text, words in (
            ("farther", "\N{MINUS SIGN}", "Smaller"),
            ("fit", "Fit", "Fit to the window"),
            ("nearer", "+", "Larger"),
            ("close", "Close", "Close the figure"),
        )
    ]
    return element(
        "dialog",
        element("div", element("p", "Figure"), buttons, class_="bar"),
        element(
            "div", element("img", alt=""), class_="stage", tabindex="0", role="region", aria_label="Figure"
        ),
        id="viewer",
        aria_label="Enlarged figure",
    )


def _provenance(product: xr.Dataset, name: str, plan: PlanTable | None, plan_name: str) -> Sequence[Content]:
    rows = [("product", name)]
    if plan is not None:
        rows.append(("plan", " ".join(filter(None, [plan_name, plan.notes.get("source")]))))
    rows += [*_attributes(product), *_versions()]
    return [
        definitions((key, element("span", text, class_="hash")) for key, text in rows),
        element("h3", "Run file, with all defaults written out"),
        element("pre", str(product.attrs.get("run_file", "not stored")), tabindex="0", aria_label="Run file"),
    ]


def _attributes(product: xr.Dataset) -> Iterator[tuple[str, str]]:
    for key in TOLD:
        if key in product.attrs:
            found = product.attrs[key]
            yield key, f"{found:.6g}" if isinstance(found, float) else str(found)


def _versions() -> Iterator[tuple[str, str]]:
    versions = []
    for package in PACKAGES:
        try:
            versions.append(f"{package} {importlib.metadata.version(package)}")
        except importlib.metadata.PackageNotFoundError:
            continue
    yield "page made with", ", ".join([*versions, f"Python {platform.python_version()}"])
