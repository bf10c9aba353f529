"""Text from files in LaTeX, Markdown and CSV, such that it is only shown."""

from __future__ import annotations

import re

from ehmo.errors import visible

_LATEX = {
    "\\": r"\textbackslash{}", "{": r"\{", "}": r"\}", "$": r"\$", "&": r"\&", "#": r"\#", "%": r"\%", "_": r"\_",
    "^": r"\textasciicircum{}", "~": r"\textasciitilde{}", "<": r"\textless{}", ">": r"\textgreater{}",
    "|": r"\textbar{}", '"': r"\textquotedbl{}", "Å": r"\AA{}",
}  # fmt: skip


def latex_text(text: str) -> str:
    r"""Text that LaTeX sets letter by letter.

    Examples
    --------
    >>> latex_text(r"50% \input{x}")
    '50\\% \\textbackslash{}input\\{x\\}'
    """
    return "".join(_LATEX.get(char, char) for char in visible(text))


_MARKDOWN = re.compile(r"([\\`*_{}\[\]()#+!|~^-])")


def markdown_text(text: str) -> str:
    r"""Text that Markdown shows letter by letter, also where it lets HTML through.

    Examples
    --------
    >>> markdown_text("a|b <i>")
    'a\\|b &lt;i&gt;'
    """
    shown = visible(text).replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")
    return _MARKDOWN.sub(r"\\\1", shown)
