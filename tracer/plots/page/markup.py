"""HTML elements whose text cannot break out of them."""

import html
from collections.abc import Iterable

CONTROLS = dict.fromkeys((*range(9), 11, 12, *range(14, 32), 127), "�")
"""Characters that HTML forbids."""
VOID = frozenset({"meta", "img", "source", "input", "col", "br"})


class Markup(str):
    """Text that is HTML already."""

    __slots__ = ()


Content = str | Iterable["Content"]


def escaped(text: str) -> Markup:
    """Return text as HTML that shows it and does nothing else, within elements and quoted attributes."""
    return Markup(html.escape(text.translate(CONTROLS), quote=True))


def joined(content: Content) -> Markup:
    """Return contents one after another; all that is not `Markup` is escaped."""
    if isinstance(content, Markup):
        return content
    if isinstance(content, str):
        return escaped(content)
    return Markup("".join(joined(part) for part in content))


def element(tag: str, *content: Content, **attributes: str | bool) -> Markup:
    """Return an element around `content`.

    Attributes that are True stand without a value, those that are False are left out; `class_` and `for_` lose their
    underscore, other underscores become hyphens.
    """
    head = tag
    for name, value in attributes.items():
        written = name.rstrip("_").replace("_", "-")
        if value is True:
            head += f" {written}"
        elif value is not False:
            head += f' {written}="{escaped(value)}"'
    if tag in VOID:
        return Markup(f"<{head}>")
    return Markup(f"<{head}>{joined(content)}</{tag}>")


def table(heads: Iterable[Content], rows: Iterable[Iterable[Content]], caption: str) -> Markup:
    """Return a table whose first column names its rows."""
    body = []
    for row in rows:
        first, *others = row
        body.append(
            element("tr", element("th", first, scope="row"), (element("td", cell) for cell in others))
        )
    head = element("tr", (element("th", one, scope="col") for one in heads))
    inner = element(
        "table", element("caption", element("span", caption)), element("thead", head), element("tbody", body)
    )
    # A table may be wider than a phone: it scrolls by itself, by keyboard too.
    return element("div", inner, class_="scroll", tabindex="0", role="region", aria_label=caption)


def definitions(rows: Iterable[tuple[Content, Content]]) -> Markup:
    """Return names with what belongs to them."""
    return element("dl", (element("div", element("dt", name), element("dd", told)) for name, told in rows))


def bullets(points: Iterable[Content]) -> Markup:
    """Return a list."""
    return element("ul", (element("li", point) for point in points))
