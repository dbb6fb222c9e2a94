"""HTML made of parts: what is not already markup is escaped, always.

There is no way to put text on a page but through :func:`tag` and :func:`join`,
which escape it, or to say `Html(...)` in so many words.
"""

from __future__ import annotations

import html
from collections.abc import Iterable


class Html(str):
    """Markup of our own, safe to put on a page as it is."""

    __slots__ = ()


Part = str | Html | Iterable["Part"] | None
"""Text, markup, or any nesting of them."""


def join(*parts: Part) -> Html:
    """Put parts together; text is escaped, markup is not.

    Parameters
    ----------
    *parts : str, Html, or iterables of them
        None is left out.

    Returns
    -------
    Html
        Markup.
    """
    return Html("".join(_one(part) for part in parts))


def _one(part: Part) -> str:
    if part is None:
        return ""
    if isinstance(part, Html):
        return str(part)
    if isinstance(part, str):
        return html.escape(part, quote=True)
    return "".join(_one(one) for one in part)


_EMPTY = frozenset({"input", "meta", "br", "rect", "circle", "line"})


def tag(name: str, *parts: Part, **attributes: str | bool | None) -> Html:
    """Make an element.

    Parameters
    ----------
    name : str
        Of the element.
    *parts : str, Html, or iterables of them
        What is inside.
    **attributes : str, bool or None
        ``cls`` stands for class, a trailing underscore is dropped, other underscores
        become hyphens; True writes the bare name, None and False nothing.

    Returns
    -------
    Html
        The element.
    """
    written = []
    for key, value in attributes.items():
        if value is None or value is False:
            continue
        word = "class" if key == "cls" else key.rstrip("_").replace("_", "-")
        written.append(word if value is True else f'{word}="{html.escape(str(value), quote=True)}"')
    opening = " ".join([name, *written])
    if name in _EMPTY:
        return Html(f"<{opening}>")
    return Html(f"<{opening}>{join(*parts)}</{name}>")


def table(head: Iterable[Part], rows: Iterable[Iterable[Part]], *, cls: str = "") -> Html:
    """Make a table whose first column names its rows.

    Parameters
    ----------
    head : iterable
        Cells of the heading.
    rows : iterable of iterables
        Cells; the first of each row is its heading.
    cls : str
        Class of the table.

    Returns
    -------
    Html
        The table.
    """
    body = []
    for row in rows:
        first, *others = row
        body.append(tag("tr", tag("th", first, scope="row"), [tag("td", one) for one in others]))
    heading = tag("tr", [tag("th", one, scope="col") for one in head])
    return tag("table", tag("thead", heading), tag("tbody", body), cls=cls or None)


def facts(rows: Iterable[tuple[str, Part]]) -> Html:
    """Make a list of names and values."""
    return tag("dl", [tag("div", tag("dt", name), tag("dd", value)) for name, value in rows])


def sentences(items: Iterable[str]) -> Html:
    """Make a list of sentences."""
    return tag("ul", [tag("li", one) for one in items])
