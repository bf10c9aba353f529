"""Counter-ions and solvent: their names and charges."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from ehmo.records.crystal import CrystalSpecies
from ehmo.records.fragment import hill_formula
from ehmo.structure.elements import ALKALI, ALKALINE_EARTH, P_BLOCK_METALS
from ehmo.structure.graph import BondGraph
from ehmo.structure.ligands import formal_charge

_HALIDES: Final = {"F": "fluoride", "Cl": "chloride", "Br": "bromide", "I": "iodide"}

_ELEMENT_NAMES: Final = {
    "Li": "lithium", "Na": "sodium", "K": "potassium", "Rb": "rubidium", "Cs": "caesium", "Fr": "francium",
    "Be": "beryllium", "Mg": "magnesium", "Ca": "calcium", "Sr": "strontium", "Ba": "barium", "Ra": "radium",
}  # fmt: skip

_KNOWN: Final[dict[str, tuple[str, str, int]]] = {
    "H2O": ("H2O", "water", 0),
    "HO": ("OH", "hydroxide", -1),
    "H3O": ("H3O", "oxonium", 1),
    "H5O2": ("H5O2", "aquaoxonium", 1),
    "H3N": ("NH3", "ammonia", 0),
    "H4N": ("NH4", "ammonium", 1),
    "N2": ("N2", "dinitrogen", 0),
    "CO2": ("CO2", "carbon dioxide", 0),
    "ClO4": ("ClO4", "perchlorate", -1),
    "IO4": ("IO4", "periodate", -1),
    "BF4": ("BF4", "tetrafluoroborate", -1),
    "F6P": ("PF6", "hexafluoridophosphate", -1),
    "F6Si": ("SiF6", "hexafluoridosilicate", -2),
    "NO3": ("NO3", "nitrate", -1),
    "NO2": ("NO2", "nitrite", -1),
    "O4S": ("SO4", "sulfate", -2),
    "HO4S": ("HSO4", "hydrogensulfate", -1),
    "O4P": ("PO4", "phosphate", -3),
    "HO4P": ("HPO4", "hydrogenphosphate", -2),
    "H2O4P": ("H2PO4", "dihydrogenphosphate", -1),
    "H3O4P": ("H3PO4", "phosphoric acid", 0),
    "CO3": ("CO3", "carbonate", -2),
    "CHO3": ("HCO3", "hydrogencarbonate", -1),
    "C2O4": ("C2O4", "oxalate", -2),
    "C2H3O2": ("CH3CO2", "acetate", -1),
    "CNS": ("SCN", "thiocyanate", -1),
    "CN": ("CN", "cyanide", -1),
    "N3": ("N3", "azide", -1),
    "I3": ("I3", "triiodide", -1),
    "CF3O3S": ("CF3SO3", "trifluoromethanesulfonate", -1),
    "C24H20B": ("B(C6H5)4", "tetraphenylborate", -1),
    "C24H20P": ("P(C6H5)4", "tetraphenylphosphonium", 1),
    "C24H20As": ("As(C6H5)4", "tetraphenylarsonium", 1),
    "C36H30NP2": ("N[P(C6H5)3]2", "bis(triphenylphosphane)iminium", 1),
    "C4H12N": ("N(CH3)4", "tetramethylammonium", 1),
    "C8H20N": ("N(C2H5)4", "tetraethylammonium", 1),
    "C16H36N": ("N(C4H9)4", "tetrabutylammonium", 1),
    "CH6N3": ("C(NH2)3", "guanidinium", 1),
    "C5H6N": ("C5H5NH", "pyridinium", 1),
    "C3H5N2": ("C3H5N2", "imidazolium", 1),
    "C2H3N": ("CH3CN", "acetonitrile", 0),
    "CH4O": ("CH3OH", "methanol", 0),
    "CH2Cl2": ("CH2Cl2", "dichloromethane", 0),
    "CHCl3": ("CHCl3", "chloroform", 0),
    "C3H6O": ("C3H6O", "acetone", 0),
    "C4H8O": ("C4H8O", "tetrahydrofuran", 0),
    "C4H10O": ("C4H10O", "diethyl ether", 0),
    "C3H7NO": ("C3H7NO", "dimethylformamide", 0),
    "C2H6OS": ("C2H6OS", "dimethyl sulfoxide", 0),
    "C5H5N": ("C5H5N", "pyridine", 0),
    "C6H6": ("C6H6", "benzene", 0),
    "C7H8": ("C7H8", "toluene", 0),
    "C5H12": ("C5H12", "pentane", 0),
    "C6H14": ("C6H14", "hexane", 0),
}
"""Usual formula, common name and charge by Hill formula (common practice)."""


@dataclass(frozen=True, slots=True)
class Identity:
    """Formula, name and charge of a species without metals; the charge counts missing hydrogens as present."""

    formula: str
    name: str
    charge: int | None
    missing_hydrogens: int = 0


def identify(graph: BondGraph, missing: int) -> Identity:
    """Name a molecule or ion without metals.

    Parameters
    ----------
    graph : BondGraph
        Of its atoms alone, no atom counting as a metal.
    missing : int
        Hydrogens that its atoms are known to lack.

    Returns
    -------
    identity : Identity
    """
    symbols = graph.symbols
    formula = hill_formula(symbols)
    if len(symbols) == 1:
        return _single_atom(symbols[0], missing)
    complete = hill_formula((*symbols, *("H" for _ in range(missing))))
    known = _KNOWN.get(complete)
    if known is not None and _fits(graph, complete):
        return Identity(known[0], known[1], known[2], missing)
    if set(symbols) & P_BLOCK_METALS:
        return Identity(formula, "", _ionic_charge(symbols, missing), missing)
    if missing:
        return Identity(formula, "", None, missing)
    return Identity(formula, "", _charge(graph))


def shown_ion(formula: str, charge: int | None) -> str:
    """Formula with its charge.

    Examples
    --------
    >>> shown_ion("K", 1), shown_ion("SO4", -2), shown_ion("H2O", 0)
    ('K+', 'SO4 2-', 'H2O')
    """
    if not charge:
        return formula
    sign = "+" if charge > 0 else "-"
    return f"{formula}{sign}" if abs(charge) == 1 else f"{formula} {abs(charge)}{sign}"


def species_in_words(species: Sequence[CrystalSpecies], share: float) -> str:
    """Numbers and formulas such as ``2 K+, 1 H2O``; `share` is the number of units they are counted for."""
    counts: dict[str, float] = {}
    for one in species:
        name = shown_ion(one.formula, one.charge)
        counts[name] = counts.get(name, 0.0) + one.count / share
    return ", ".join(f"{count:.3g} {name}" for name, count in counts.items())


def _single_atom(symbol: str, missing: int) -> Identity:
    if symbol in ALKALI | ALKALINE_EARTH:
        return Identity(symbol, _ELEMENT_NAMES[symbol], 1 if symbol in ALKALI else 2)
    if symbol in _HALIDES:
        return Identity(symbol, _HALIDES[symbol], -1)
    if symbol == "H":
        return Identity("H", "proton, as between two water molecules", 1)
    if symbol == "O" and missing == 2:
        return Identity("H2O", "water", 0, 2)
    if symbol == "N":
        return Identity("N", "ammonia or ammonium", None, missing)
    return Identity(symbol, "", None, missing)


def _ionic_charge(symbols: Sequence[str], missing: int) -> int | None:
    """Charge of an aggregate of aluminium, gallium or indium with oxide, hydroxide, water and halide."""
    charges = {"Al": 3, "Ga": 3, "In": 3, "O": -2, "H": 1, **dict.fromkeys(_HALIDES, -1)}
    if not set(symbols) <= charges.keys():
        return None
    return sum(charges[symbol] for symbol in symbols) + missing


def _fits(graph: BondGraph, complete: str) -> bool:
    """Whether the bonds are those of the name: of the ethers, not of the alcohols, with that formula."""
    ether = any(s == "O" and len(near) == 2 for s, near in zip(graph.symbols, graph.neighbours, strict=True))
    return complete != "C4H10O" or ether


def _charge(graph: BondGraph) -> int | None:
    """Closed-shell charge; cations that share a lone pair with carbon, and onium ions, by their own rules."""
    atoms = tuple(range(len(graph.symbols)))
    formal = formal_charge(graph, {}, atoms).charge
    if formal is None:
        return None
    onium = sum(
        symbol in ("P", "As", "Sb") and len(near) == 4 and all(graph.symbols[k] == "C" for k in near)
        for symbol, near in zip(graph.symbols, graph.neighbours, strict=True)
    )
    if onium and formal in (-onium, onium):
        return onium
    protonated = any(
        symbol == "N"
        and len(near) == 3
        and any(graph.symbols[k] == "C" and len(graph.neighbours[k]) == 3 for k in near)
        for symbol, near in zip(graph.symbols, graph.neighbours, strict=True)
    )
    if formal == -1 and protonated and not any(graph.symbols[k] in ("O", "S") for k in atoms):
        return 1  # amidinium, pyridinium and imidazolium ions: an open valence next to a lone pair
    return formal
