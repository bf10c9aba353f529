"""The view in three dimensions and its controls."""

from __future__ import annotations

from ehmo.report.page.markup import Markup, element
from ehmo.report.page.shown import LEVELS, USUAL_LEVEL


def viewer() -> Markup:
    """View in three dimensions with its controls."""
    parts = (("both", "Both hybrids"), ("metal", "Metal"), ("donor", "Donor"))
    hybrids = element(
        "span",
        [element("button", words, type="button", data_show=name, aria_pressed="false") for name, words in parts],
        class_="group needs-webgl",
        role="group",
        aria_label="Hybrids shown",
    )
    value = element(
        "label",
        "Surface at ",
        element("input", type="range", id="level", min="0", max=len(LEVELS) - 1, step="1", value=USUAL_LEVEL,
                aria_describedby="level-value"),
        element(
            "span",
            element("span", f"{LEVELS[USUAL_LEVEL]:.2f}", id="level-value"),
            " bohr",
            element("sup", "\N{MINUS SIGN}3/2"),
        ),
        class_="needs-webgl",
    )  # fmt: skip
    labels = element(
        "label", element("input", type="checkbox", id="labels", checked=True), "Labels", class_="needs-webgl"
    )
    reset = element("button", "Reset view", type="button", id="reset", class_="needs-webgl")
    key = element(
        "span",
        element("span", element("i", class_="plus"), "positive"),
        element("span", element("i", class_="minus"), "negative phase"),
        class_="key",
    )
    keys = "Drag to turn. With the keyboard: arrow keys turn, + and \N{MINUS SIGN} zoom, Home resets."
    return element(
        "div",
        element("p", "", id="shown", class_="shown", role="status"),
        element(
            "div",
            element(
                "div",
                id="view",
                tabindex="0",
                role="img",
                aria_label="Molecule in three dimensions",
                aria_describedby="keys",
            ),
            element("img", id="view-still", src="data:,", alt=""),
            class_="stage",
        ),
        element("div", hybrids, value, labels, reset, key, class_="controls"),
        element("p", keys, id="keys", class_="note needs-webgl"),
        element("p", "", id="why-still", class_="note"),
        element("div", id="carriers-here"),
        class_="viewer needs-script",
        id="viewer",
    )
