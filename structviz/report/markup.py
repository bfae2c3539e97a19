"""HTML from text that may hold anything: every piece is escaped once, here, and nowhere else.

A `Markup` is text known to be HTML. Whatever is not one is escaped when it is put into an element.
"""

from __future__ import annotations

from collections.abc import Iterable
from html import escape

from structviz.report.names import printable


class Markup(str):
    """Text that is HTML already."""

    __slots__ = ()


Content = str | Iterable[str]
VOID = {"img", "input", "meta", "br", "hr"}


def plain(text: object) -> Markup:
    """Return text as HTML: escaped, with control and direction marks shown as the replacement mark.

    >>> plain('<b>"x"')
    '&lt;b&gt;&quot;x&quot;'
    """
    return text if isinstance(text, Markup) else Markup(escape(printable(str(text))))


def given(text: object) -> Markup:
    """Return text that came from a user, kept apart from the words around it so that its writing direction does not turn theirs.

    >>> given("a<b")
    '<bdi>a&lt;b</bdi>'
    """
    return Markup(f"<bdi>{plain(text)}</bdi>")


def joined(*pieces: Content) -> Markup:
    """Return pieces, or lists of pieces, put together in order."""
    whole = (piece for group in pieces for piece in ([group] if isinstance(group, str) else group))
    return Markup("".join(plain(piece) for piece in whole))


def element(tag: str, *content: Content, **attributes: object) -> Markup:
    """Return an element; an underscore in the name of an attribute stands for a dash, one at the end is dropped, None leaves it out.

    >>> element("p", "a & b", class_="note", data_fault=3)
    '<p class="note" data-fault="3">a &amp; b</p>'
    >>> element("input", type="search", hidden=True)
    '<input type="search" hidden>'
    """
    shown = "".join(_attribute(name, value) for name, value in attributes.items() if value is not None and value is not False)
    return Markup(f"<{tag}{shown}>" if tag in VOID else f"<{tag}{shown}>{joined(*content)}</{tag}>")


def _attribute(name: str, value: object) -> str:
    name = name.rstrip("_").replace("_", "-")
    return f" {name}" if value is True else f' {name}="{plain(value)}"'


def table(head: Iterable[Content], rows: Iterable[Iterable[Content]], *, numeric: Iterable[int] = (), **attributes: object) -> Markup:
    """Return a table; columns by their numbers in `numeric` are set right."""
    right = set(numeric)

    def cell(tag: str, column: int, content: Content) -> Markup:
        return element(tag, content, class_="n" if column in right else None, scope="col" if tag == "th" else None)

    top = element("tr", [cell("th", k, each) for k, each in enumerate(head)])
    body = [element("tr", [cell("td", k, each) for k, each in enumerate(row)]) for row in rows]
    return element("table", element("thead", top), element("tbody", body), **attributes)
