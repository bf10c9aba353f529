"""Formulas, irreps and terms as markup with their indices."""

from __future__ import annotations

import re
from typing import Final

from ehmo.records.crystal_report import CrystalReport
from ehmo.records.report import BondReport
from ehmo.report.formula import complex_formula
from ehmo.report.page.markup import Markup, element, markup

PART_LETTERS: Final = {"sigma": "σ", "pi": "π", "delta": "δ", "phi": "φ"}
"""Greek letter of each bond part."""

_PIECE = re.compile(r"([A-Z][a-z]?|[()])(\d*)")
_IRREP = re.compile(r"(\d*)([abetgABETGσπδφγΣΠΔΦΓ])([123]?[gu]?)('{0,2})([+\-]?)")
_TERM = re.compile(r"(\d+)([A-Z]|[ΣΠΔΦΓ])([123]?[gu]?)('{0,2})([+\-]?)")
_LONG = re.compile(r"\d*[abetg][123gu][^ ]*")
_CORE = re.compile(r"([(]*)(.*?)([),;:⁰¹²³⁴⁵⁶⁷⁸⁹]*)")
_SPACE = Markup(" ")
_MINUS = "\N{MINUS SIGN}"


def formula_markup(report: BondReport) -> Markup:
    """Formula with subscripts and charge, such as ``[VO(H2O)5]2+``."""
    charge = report.fragment.charge
    body = hill_markup(complex_formula(report))
    if not charge:
        return body
    size = "" if abs(charge) == 1 else str(abs(charge))
    raised = element("sup", f"{size}{'+' if charge > 0 else _MINUS}")
    return markup(["[", body, "]", raised])


def hill_markup(formula: str) -> Markup:
    """Formula with subscripts."""
    pieces = _PIECE.findall(formula)
    return markup([[symbol, element("sub", count) if count else None] for symbol, count in pieces])


def crystal_formula(report: CrystalReport) -> str:
    """Formula of the first network of a crystal, else of its cell, metals first, such as ``V2O5``."""
    formula = (report.networks[0] if report.networks else report.formula).rpartition(" ")[2]
    pieces = _PIECE.findall(formula)
    if "".join(symbol + count for symbol, count in pieces) != formula:
        return report.formula
    metals = {unit.metal_symbol for unit in report.units}
    ordered = sorted(pieces, key=lambda piece: piece[0] not in metals)
    return "".join(symbol + count for symbol, count in ordered)


def formula_plain(report: BondReport) -> str:
    """The same as plain text, for the title of the window."""
    charge = report.fragment.charge
    text = complex_formula(report)
    return f"[{text}] {abs(charge) if abs(charge) > 1 else ''}{'+' if charge > 0 else _MINUS}" if charge else text


def irrep_markup(label: str) -> Markup:
    """Orbital label such as ``2t2g`` with its index; other text as it is."""
    found = _IRREP.fullmatch(label)
    if not found:
        return markup(label)
    number, letter, below, primes, sign = found.groups()
    return markup(
        [
            number,
            letter,
            element("sub", below) if below else None,
            "\N{PRIME}" * len(primes),
            element("sup", sign.replace("-", _MINUS)) if sign else None,
        ]
    )


def term_markup(label: str) -> Markup:
    """Term such as ``3T1g`` with its indices; other text as it is."""
    found = _TERM.fullmatch(label)
    if not found:
        return markup(label)
    multiplicity, letter, below, primes, sign = found.groups()
    return markup([element("sup", multiplicity), irrep_markup(f"{letter}{below}{primes}{sign}")])


def symbols_markup(text: str) -> Markup:
    """Text with its terms and irreps set with indices."""
    return markup([_SPACE if k else None, _set(word)] for k, word in enumerate(text.split(" ")))


def _set(word: str) -> Markup:
    """One word, its brackets and punctuation apart."""
    start, core, end = _CORE.fullmatch(word).groups()  # type: ignore[union-attr]
    symbol = term_markup(core) if _TERM.fullmatch(core) else irrep_markup(core) if _LONG.fullmatch(core) else core
    return markup([start, symbol, end])


def part_letter(name: str) -> str:
    """Bond part such as ``pi*`` with its Greek letter."""
    bare = name.rstrip("*")
    return PART_LETTERS.get(bare, bare) + name[len(bare) :]
