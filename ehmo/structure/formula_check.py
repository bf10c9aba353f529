"""The atoms of a cell held against the formula that the file gives."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping

from ehmo.structure.periodic import PeriodicCell


def formula_notes(cell: PeriodicCell) -> list[str]:
    """Where the sites do not add up to the formula of the file."""
    formula = cell.facts.formula
    if not formula:
        return []
    have: dict[str, float] = defaultdict(float)
    for symbol, occupancy in zip(cell.symbols, cell.occupancies.tolist(), strict=True):
        have[symbol] += occupancy
    for site in cell.facts.left_out:
        have[site.symbol] += site.count
    units = cell.facts.formula_units or _formula_units(have, formula)
    if not units:
        return []
    off = {
        symbol: have.get(symbol, 0.0) / units - number
        for symbol, number in {**dict.fromkeys(have, 0.0), **formula}.items()
        if abs(have.get(symbol, 0.0) / units - number) > max(0.1, 0.03 * number)
    }
    if not off:
        return []
    parts = ", ".join(f"{symbol} {have.get(symbol, 0.0) / units:.3g} of {formula.get(symbol, 0.0):g}" for symbol in off)
    if set(off) == {"H"} and "H" not in formula:
        return []  # placed hydrogens, or a formula that leaves them out
    return [f"The sites do not add up to the formula of the file, per formula unit: {parts}."]


def _formula_units(have: Mapping[str, float], formula: Mapping[str, float]) -> float:
    """Formula units in the cell, by the heavy element that occurs least."""
    ratios = sorted(
        (number, have[symbol] / number) for symbol, number in formula.items() if symbol != "H" and have.get(symbol)
    )
    return ratios[0][1] if ratios else 0.0
