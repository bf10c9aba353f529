"""Figures of records for notebooks and scripts: each shows itself and saves itself as SVG, PDF or PNG."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ehmo.errors import InputError
from ehmo.report.figures.canvas import figure_bytes, figure_format, look_named
from ehmo.report.figures.catalogue import FIGURE_KINDS
from ehmo.report.figures.choice import labelled

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from ehmo.records.crystal_report import CrystalReport
    from ehmo.records.report import BondReport
    from ehmo.records.scan import Scan

__all__ = [
    "Drawing",
    "channels",
    "crystal",
    "interaction",
    "ladder",
    "overview",
    "population",
    "scan",
    "spectrum",
]


@dataclass(frozen=True, slots=True, eq=False)
class Drawing:
    """A finished figure.

    Attributes
    ----------
    words : str
        What it shows.
    figure : Figure
        As matplotlib has it.
    """

    words: str
    figure: Figure

    def svg(self) -> str:
        """Text of an SVG file."""
        return figure_bytes(self.figure, "svg").decode()

    def save(self, path: str | Path) -> None:
        """Write the figure; the end of the name tells the format.

        Parameters
        ----------
        path : str or Path
            Ends in .svg, .pdf or .png.

        Raises
        ------
        InputError
            If the end of the name is another, or the file cannot be written.
        """
        content = figure_bytes(self.figure, figure_format(str(path)))
        try:
            Path(path).write_bytes(content)
        except OSError as fault:
            raise InputError(
                f"cannot write the file ({fault.strerror or fault})", place=str(path), mend="choose another place"
            ) from fault

    def _repr_svg_(self) -> str:
        return self.svg()

    def __repr__(self) -> str:
        return f"<Drawing: {self.words}>"


def _drawing(kind: str, record: Any, look: str, width_mm: float | None, **options: Any) -> Drawing:
    found = FIGURE_KINDS[kind]
    width = found.width_mm if width_mm is None else width_mm
    given = {name: value for name, value in options.items() if value is not None}
    return Drawing(found.words, found.draw(record, look=look_named(look), width_cm=width / 10, **given))


def _bond(report: BondReport, bond: int | str | None) -> int | None:
    if not isinstance(bond, str):
        return bond
    labels = [report.bond_label(one) for one in report.coordination.bonds]
    return labelled(labels, bond, report.fragment.source)


def interaction(
    report: BondReport, bond: int | str | None = None, *, look: str = "light", width_mm: float | None = None
) -> Drawing:
    """Interaction diagram of one bond.

    Parameters
    ----------
    report : BondReport
    bond : int or str, optional
        Place in the report, or label such as ``V1-O2``; by default the shortest one that may be multiple.
    look : {"light", "dark"}
    width_mm : float, optional
        On paper, 84 by default [mm].

    Returns
    -------
    drawing : Drawing
    """
    return _drawing("interaction", report, look, width_mm, bond=_bond(report, bond))


def population(
    report: BondReport, bond: int | str | None = None, *, look: str = "light", width_mm: float | None = None
) -> Drawing:
    """Overlap population of one bond against energy; parameters as of `interaction`."""
    return _drawing("population", report, look, width_mm, bond=_bond(report, bond))


def ladder(
    report: BondReport, metal: int | None = None, *, look: str = "light", width_mm: float | None = None
) -> Drawing:
    """Levels, terms and observed bands.

    Parameters
    ----------
    report : BondReport
    metal : int, optional
        Atom index; by default the first metal with a ladder.
    look : {"light", "dark"}
    width_mm : float, optional
        On paper, 84 by default [mm].

    Returns
    -------
    drawing : Drawing
    """
    return _drawing("ladder", report, look, width_mm, metal=metal)


def channels(report: BondReport, *, look: str = "light", width_mm: float | None = None) -> Drawing:
    """Channels of every bond as bars; parameters as of `interaction`."""
    return _drawing("channels", report, look, width_mm)


def spectrum(
    report: BondReport,
    observed_per_cm: Sequence[float] = (),
    *,
    look: str = "light",
    width_mm: float | None = None,
) -> Drawing:
    """Computed bands with their envelope.

    Parameters
    ----------
    report : BondReport
    observed_per_cm : sequence of float
        Observed bands to mark, besides those that the report was fitted to [cm^-1].
    look : {"light", "dark"}
    width_mm : float, optional
        On paper, 84 by default [mm].

    Returns
    -------
    drawing : Drawing
    """
    return _drawing("spectrum", report, look, width_mm, observed_per_cm=tuple(observed_per_cm))


def crystal(
    report: CrystalReport,
    window_eV: tuple[float, float] | None = None,
    *,
    look: str = "light",
    width_mm: float | None = None,
) -> Drawing:
    """Bands, density of states and overlap population of an extended structure.

    Parameters
    ----------
    report : CrystalReport
    window_eV : tuple of float, optional
        Lowest and highest energy, from the highest filled level [eV].
    look : {"light", "dark"}
    width_mm : float, optional
        On paper, 84 by default [mm].

    Returns
    -------
    drawing : Drawing
    """
    return _drawing("crystal", report, look, width_mm, window_eV=window_eV)


def scan(record: Scan, bond: int | str | None = None, *, look: str = "light", width_mm: float | None = None) -> Drawing:
    """Channels, levels and energy along a scan.

    Parameters
    ----------
    record : Scan
    bond : int or str, optional
        Place or label of the bond in the first panel; by default the scanned one.
    look : {"light", "dark"}
    width_mm : float, optional
        On paper, 84 by default [mm].

    Returns
    -------
    drawing : Drawing
    """
    place = labelled(record.bond_labels, bond, "") if isinstance(bond, str) else bond
    return _drawing("scan", record, look, width_mm, bond=place)


def overview(reports: Iterable[BondReport], *, look: str = "light", width_mm: float | None = None) -> Drawing:
    """Order against length of the bonds of many reports.

    Parameters
    ----------
    reports : iterable of BondReport
    look : {"light", "dark"}
    width_mm : float, optional
        On paper, 174 by default [mm].

    Returns
    -------
    drawing : Drawing
    """
    from ehmo.report.figures.overview import bonds_of

    return _drawing("overview", bonds_of(reports), look, width_mm)
