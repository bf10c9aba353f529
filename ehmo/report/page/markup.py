"""HTML and SVG that cannot carry text of a file as anything but text.

A `Markup` is finished HTML; any other string is text and is escaped where it is put in. Nothing here takes a string
from outside as markup.
"""

from __future__ import annotations

import base64
import hashlib
import json
import re
from collections.abc import Iterable, Sequence
from html import escape
from typing import Any

from ehmo.errors import visible

_VOID = frozenset({"br", "hr", "img", "input", "meta", "link", "line", "path", "rect", "circle", "use", "polyline"})
_NAME = re.compile(r"[A-Za-z][A-Za-z0-9:-]*")


class Markup(str):
    """HTML that is put in as it is."""

    __slots__ = ()


Content = str | Markup | None | Iterable["Content"]


def markup(content: Content) -> Markup:
    """Content as markup: text escaped, control characters shown, sequences joined, None left out."""
    if content is None:
        return Markup("")
    if isinstance(content, Markup):
        return content
    if isinstance(content, str):
        return Markup(escape(visible(content), quote=True))
    return Markup("".join(markup(part) for part in content))


def element(tag: str, *content: Content, **attributes: object) -> Markup:
    """One element.

    Parameters
    ----------
    tag : str
    *content : Content
        Text, markup, or sequences of both.
    **attributes : object
        ``class_`` and ``for_`` stand for the reserved words, other underscores for hyphens (``view_box`` is written
        ``viewBox``); None and False are left out, True gives an attribute without value.

    Returns
    -------
    html : Markup

    Examples
    --------
    >>> element("p", "a < b", class_="note")
    '<p class="note">a &lt; b</p>'
    """
    if not _NAME.fullmatch(tag):
        raise ValueError(f"{tag!r} names no element")
    words = [tag]
    for name, value in attributes.items():
        if value is None or value is False:
            continue
        written = "viewBox" if name == "view_box" else name.rstrip("_").replace("_", "-")
        if not _NAME.fullmatch(written):
            raise ValueError(f"{written!r} names no attribute")
        words.append(written if value is True else f'{written}="{escape(visible(str(value)), quote=True)}"')
    opened = " ".join(words)
    # The slash ends elements of SVG, and does nothing to those of HTML.
    return Markup(f"<{opened}/>" if tag in _VOID else f"<{opened}>{markup(content)}</{tag}>")


def table(
    rows: Sequence[Sequence[Content]], caption: Content, numeric: Iterable[int] = (), *, row_heads: bool = True
) -> Markup:
    """Table with a caption; the first row heads the columns, the first cell of each row heads the row.

    Parameters
    ----------
    rows : sequence of sequences of Content
    caption : Content
    numeric : iterable of int
        Columns that hold numbers.
    row_heads : bool
        Whether the first cell of each row is its heading.

    Returns
    -------
    html : Markup
    """
    numbers = set(numeric)
    head, *body = rows

    def style(column: int) -> str | None:
        return "number" if column in numbers else None

    heads = [element("th", cell, scope="col", class_=style(k)) for k, cell in enumerate(head)]
    lines = []
    for row in body:
        cells = [
            element("th", cell, scope="row", class_=style(k))
            if row_heads and k == 0
            else element("td", cell, class_=style(k))
            for k, cell in enumerate(row)
        ]
        lines.append(element("tr", cells))
    # A wide table scrolls in its own frame, reached by keyboard as well.
    inner = element(
        "table", element("caption", caption), element("thead", element("tr", heads)), element("tbody", lines)
    )
    return element("div", inner, class_="table", tabindex="0", role="region", aria_label=_plain(caption))


def _plain(content: Content) -> str:
    return re.sub(r"<[^>]*>", "", markup(content)).replace("&lt;", "<").replace("&gt;", ">").replace("&amp;", "&")


def embedded_json(value: Any) -> Markup:
    r"""JSON that may stand inside a script element: no character of it can end or open anything.

    Examples
    --------
    >>> print(embedded_json("</script>"))
    "\u003c/script\u003e"
    """
    text = json.dumps(value, ensure_ascii=True, allow_nan=False, separators=(",", ":"))
    for char in "<>&":
        text = text.replace(char, f"\\u{ord(char):04x}")
    return Markup(text)


def content_hash(text: str) -> str:
    """Source expression of a content-security policy for an inline script or style sheet."""
    return f"'sha256-{base64.b64encode(hashlib.sha256(text.encode('utf-8')).digest()).decode('ascii')}'"


def data_address(text: str | bytes, kind: str) -> str:
    """Address that holds a file to download."""
    raw = text.encode("utf-8") if isinstance(text, str) else text
    return f"data:{kind};base64,{base64.b64encode(raw).decode('ascii')}"
