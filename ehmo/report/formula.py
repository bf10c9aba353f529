"""Formula of a complex as chemists write it: metal first, then its ligands."""

from __future__ import annotations

from typing import Final

from ehmo.records.fragment import hill_formula
from ehmo.records.report import BondReport

LONGEST: Final = 28
"""A longer formula is given in Hill order instead."""


def complex_formula(report: BondReport) -> str:
    """Formula without its charge, such as ``VO(H2O)5``; in Hill order where it would be long.

    Parameters
    ----------
    report : BondReport

    Returns
    -------
    formula : str
    """
    coordination, symbols = report.coordination, report.fragment.symbols
    multiple = {bond.ligand for bond in coordination.bonds if bond.may_be_multiple}
    counts: dict[str, int] = {}
    bare = [k for k, ligand in enumerate(coordination.ligands) if ligand.metals]
    for k in sorted(bare, key=lambda k: (k not in multiple, len(coordination.ligands[k].atoms) > 1)):
        formula = coordination.ligands[k].formula
        counts[formula] = counts.get(formula, 0) + 1
    text = hill_formula(tuple(symbols[metal] for metal in coordination.metals))
    for formula, count in counts.items():
        single = sum(letter.isupper() for letter in formula) == 1 and formula.isalpha()
        text += formula if single or count == 1 == len(counts) else f"({formula})"
        text += str(count) if count > 1 else ""
    whole = all(ligand.metals for ligand in coordination.ligands)
    return text if whole and len(text) <= LONGEST else report.fragment.formula
