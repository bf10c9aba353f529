"""Every kind of figure by its name, and what it is drawn from.

The command line reads this before it knows what is asked for, so nothing heavy is imported here.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from importlib import import_module
from typing import TYPE_CHECKING, Final, Literal

if TYPE_CHECKING:
    from matplotlib.figure import Figure

Source = Literal["molecule", "crystal", "scan", "store"]


@dataclass(frozen=True, slots=True)
class FigureKind:
    """One kind of figure.

    Attributes
    ----------
    name : str
        As the command line has it.
    source : {"molecule", "crystal", "scan", "store"}
        What it is drawn from: a bond report, a crystal report, a scan, or the bonds of a store.
    words : str
        What it shows.
    home, function : str
        Module below ``ehmo.report.figures`` and function that draws it.
    options : tuple of str
        Options of the command line that bear on it, besides those of every figure of its source.
    width_mm : float
        Usual width [mm].
    """

    name: str
    source: Source
    words: str
    home: str
    function: str
    options: tuple[str, ...] = ()
    width_mm: float = 84.0

    @property
    def draw(self) -> Callable[..., Figure]:
        """Function that draws it: record first, then ``look`` and ``width_cm`` by name."""
        found: Callable[..., Figure] = getattr(import_module(f"ehmo.report.figures.{self.home}"), self.function)
        return found


_KINDS = (
    FigureKind(
        "interaction",
        "molecule",
        "how metal and ligand levels make the orbitals",
        "interaction",
        "interaction_diagram",
        ("bond",),
    ),
    FigureKind(
        "ladder",
        "molecule",
        "d or f levels, terms and observed bands",
        "ladder",
        "ladder_figure",
        ("bands", "metal", "spread"),
    ),
    FigureKind(
        "channels", "molecule", "sigma and pi channels of every bond as bars", "channels", "channel_bars", ("spread",)
    ),
    FigureKind(
        "population",
        "molecule",
        "overlap population of a bond against energy",
        "population",
        "overlap_population",
        ("bond",),
    ),
    FigureKind(
        "spectrum",
        "molecule",
        "computed bands with their envelope, observed ones",
        "spectrum",
        "spectrum_figure",
        ("bands",),
    ),
    FigureKind(
        "crystal",
        "crystal",
        "bands, density of states and overlap population",
        "crystal",
        "band_figure",
        ("mesh", "path", "window"),
    ),
    FigureKind("scan", "scan", "channels, levels and energy along a scan", "scan", "scan_figure", ("bond",)),
    FigureKind(
        "overview",
        "store",
        "order against length by metal and kind",
        "overview",
        "overview_figure",
        ("where",),
        174.0,
    ),
)

FIGURE_KINDS: Final = {kind.name: kind for kind in _KINDS}
"""Kinds by name."""
