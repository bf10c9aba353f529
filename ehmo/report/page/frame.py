"""The document of a page: policy, colours, scripts, and what they are packed in."""

from __future__ import annotations

import base64
import zlib
from importlib import resources
from typing import Any, Final

from ehmo import __version__
from ehmo.errors import InputError
from ehmo.report.look import DARK, LIGHT, PAGE_FONTS, Look
from ehmo.report.page.markup import Markup, content_hash, element, embedded_json

_LIBRARY_PACKING: Final = 5  # higher levels save little and take long


def plotting_library() -> str:
    """Script of the plotting library, from its own package.

    Raises
    ------
    InputError
        If a library of the extra ``page`` is missing.
    """
    try:
        import skimage.measure  # noqa: F401  (fail before the calculation of surfaces, with the same words)

        text = resources.files("plotly").joinpath("package_data", "plotly.min.js").read_text("utf-8")
    except (ImportError, FileNotFoundError) as fault:
        missing = getattr(fault, "name", None) or "plotly"
        raise InputError(
            f"--page needs {missing}, which is not installed", mend="install it with: pip install 'ehmo[page]'"
        ) from None
    # A document has no carriage returns, and the hash is over what the browser reads.
    return text.replace("\r\n", "\n").replace("\r", "\n")


def document(title: str, body: Markup, data: dict[str, Any] | None = None, library: str = "") -> str:
    """Whole document of a page.

    Parameters
    ----------
    title : str
        For the window.
    body : Markup
    data : dict, optional
        For the script, where there is a view in three dimensions.
    library : str
        Script of the plotting library, where there is such a view.

    Returns
    -------
    html : str
        Its policy admits the two scripts alone.
    """
    style = f"{colours()}\n{own_file('page.css')}"
    script = own_file("page.js")
    # Styles are not restricted to hashes: the plotting library sets them on its elements. They can load nothing.
    policy = "; ".join(
        (
            "default-src 'none'",
            f"script-src {content_hash(script)}{f' {content_hash(library)}' if library else ''}",
            "style-src 'unsafe-inline'",
            "img-src data: blob:",
            "base-uri 'none'",
            "form-action 'none'",
        )
    )
    packed = base64.b64encode(zlib.compress(library.encode("utf-8"), _LIBRARY_PACKING)).decode("ascii")
    head = element(
        "head",
        element("meta", charset="utf-8"),
        element("meta", http_equiv="Content-Security-Policy", content=policy),
        element("meta", name="viewport", content="width=device-width, initial-scale=1"),
        element("meta", name="referrer", content="no-referrer"),
        element("meta", name="generator", content=f"ehmo {__version__}"),
        element("title", title),
        element("style", Markup(style)),
    )
    whole = element(
        "body",
        element("a", "To the bonds", href="#bonds", class_="skip"),
        body,
        element("footer", f"ehmo {__version__}; this page holds all its parts and loads nothing."),
        [
            element("script", embedded_json(data), type="application/json", id="page-data"),
            element("script", Markup(packed), type="text/plain", id="page-library"),
        ]
        if library
        else None,
        element("script", Markup(script)),
    )
    return f"<!DOCTYPE html>\n{element('html', head, whole, lang='en')}\n"


def own_file(name: str) -> str:
    """Text of a file that lies beside these modules."""
    return resources.files("ehmo.report.page").joinpath(name).read_text("utf-8")


def colours() -> str:
    """Colours of the looks as variables: light on screen and paper, dark where the reader's screen is dark."""
    fonts = ", ".join(f'"{font}"' if " " in font else font for font in PAGE_FONTS)

    def variables(look: Look) -> str:
        roles = [role for role in look.__slots__ if role != "name"]
        return " ".join(f"--{role}: {getattr(look, role)};" for role in roles)

    return (
        f":root {{ {variables(LIGHT)} --fonts: {fonts}; }}\n"
        f"@media screen and (prefers-color-scheme: dark) {{ :root {{ {variables(DARK)} }} }}"
    )
