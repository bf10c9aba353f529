"""Records as HTML for a notebook: tables and lists, every word escaped."""

from __future__ import annotations

from collections.abc import Sequence
from html import escape

from ehmo.errors import visible


def html_table(caption: str, rows: Sequence[Sequence[str]], numeric: Sequence[int] = ()) -> str:
    """Table with a caption, its first row the heading.

    Parameters
    ----------
    caption : str
    rows : sequence of sequence of str
        Plain text, hostile or not: it is escaped here.
    numeric : sequence of int
        Columns aligned to the right.

    Returns
    -------
    html : str
    """
    head, *body = rows
    sides = ["right" if k in numeric else "left" for k in range(len(head))]
    lines = [_row("th", ' scope="col"', head, sides), *(_row("td", "", row, sides) for row in body)]
    words = f'<caption style="text-align:left;caption-side:top">{escape(visible(caption))}</caption>'
    return f"<table>{words}{''.join(lines)}</table>"


def _row(tag: str, extra: str, cells: Sequence[str], sides: Sequence[str]) -> str:
    made = (
        f'<{tag}{extra} style="text-align:{side}">{escape(visible(cell))}</{tag}>'
        for cell, side in zip(cells, sides, strict=True)
    )
    return f"<tr>{''.join(made)}</tr>"


def html_sentences(title: str, sentences: Sequence[str], *, shown: bool = False) -> str:
    """List that opens on a click; empty without sentences.

    Parameters
    ----------
    title : str
    sentences : sequence of str
    shown : bool
        Whether it is open from the start.

    Returns
    -------
    html : str
    """
    if not sentences:
        return ""
    items = "".join(f"<li>{escape(visible(sentence))}</li>" for sentence in sentences)
    return f"<details{' open' if shown else ''}><summary>{escape(title)}</summary><ul>{items}</ul></details>"
