"""What every page shares: its files and the colours of its looks."""

from __future__ import annotations

from importlib import resources

from ehmo.report.look import DARK, LIGHT, PAGE_FONTS, Look


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
