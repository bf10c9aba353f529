"""Works as BibTeX entries."""

from __future__ import annotations

import re
from collections.abc import Iterable

import basis_params
from basis_params.bibliography import Reference
from ehmo.report.escaping import latex_text

_KEY = re.compile(r"[^A-Za-z0-9:_.+-]+")


def bibtex(keys: Iterable[str]) -> str:
    """BibTeX entries of some works.

    Parameters
    ----------
    keys : iterable of str
        Keys of the bibliography of `basis_params`; others, as a user's parameter table may have, make an entry with a
        note alone.

    Returns
    -------
    text : str
        UTF-8, as current BibTeX styles take it.
    """
    known = basis_params.references()
    entries = []
    for key in dict.fromkeys(keys):
        name = _KEY.sub("-", key).strip("-") or "unnamed"
        entries.append(_entry(name, known[key]) if key in known else _shown("misc", name, {"note": latex_text(key)}))
    return "\n".join(entries)


def _entry(key: str, work: Reference) -> str:
    fields = {"author": _authors(work.authors)}
    if work.volume or work.page:
        kind = "article"
        fields |= {"title": work.title and f"{{{latex_text(work.title)}}}", "journal": latex_text(work.journal)}
        fields |= {"volume": latex_text(work.volume), "pages": latex_text(work.page)}
    else:
        kind = "misc"
        fields |= {"title": f"{{{latex_text(work.title or work.journal)}}}"}
        fields |= {"howpublished": latex_text(work.journal) if work.title else ""}
    fields["year"] = str(work.year) if work.year else ""
    return _shown(kind, key, fields)


def _authors(words: str) -> str:
    """Names joined as BibTeX wants them; a group of people stays one name."""
    listed = words.replace(" and co-workers", ", others").split(", ")
    return " and ".join(f"{{{latex_text(name)}}}" if "Team" in name or "developers" in name else latex_text(name)
                        for name in listed)  # fmt: skip


def _shown(kind: str, key: str, fields: dict[str, str]) -> str:
    rows = [f"  {name} = {{{value}}}" for name, value in fields.items() if value]
    return f"@{kind}{{{key},\n" + ",\n".join(rows) + "\n}\n"
