"""Every kind of figure by its name, and what it is drawn from."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from importlib import import_module
from typing import TYPE_CHECKING, Final, Literal

if TYPE_CHECKING:
    from matplotlib.figure import Figure

Source = Literal["molecule", "crystal"]


@dataclass(frozen=True, slots=True)
class FigureKind:
    """One kind of figure.

    Attributes
    ----------
    name : str
        As the command line has it.
    source : {"molecule", "crystal"}
        Record that it is drawn from: a bond report or a crystal report.
    words : str
        What it shows.
    home, function : str
        Module below ``ehmo.report.figures`` and function that draws it.
    """

    name: str
    source: Source
    words: str
    home: str
    function: str

    @property
    def draw(self) -> Callable[..., Figure]:
        """Function that draws it: record first, then ``look`` and ``width_cm`` by name."""
        found: Callable[..., Figure] = getattr(import_module(f"ehmo.report.figures.{self.home}"), self.function)
        return found


_KINDS = (
    FigureKind(
        "interaction", "molecule", "how metal and ligand levels make the orbitals", "interaction", "interaction_diagram"
    ),
    FigureKind("ladder", "molecule", "d or f levels, terms and observed bands", "ladder", "ladder_figure"),
    FigureKind("channels", "molecule", "sigma and pi channels of every bond as bars", "channels", "channel_bars"),
)

FIGURE_KINDS: Final = {kind.name: kind for kind in _KINDS}
"""Kinds by name."""
