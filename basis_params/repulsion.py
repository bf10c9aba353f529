"""Two-body terms at the head of a parameter table, one line per pair of elements.

``# repulsion V-O = 1234.5 eV, 3.21 per_A, 1.50 to 2.40 A, source_key, locator, derived``
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import get_args

from basis_params.atoms import atom_symbols
from basis_params.faults import FaultList, number, plain_text, shown
from basis_params.model import PairRepulsion, Provenance

EXAMPLE = "# repulsion V-O = 1234.5 eV, 3.21 per_A, 1.50 to 2.40 A, source_key, locator, derived"

LARGEST_EV = 1e7
LARGEST_PER_A = 50.0
LARGEST_A = 20.0
"""Bounds far outside any two-body term of valence electrons: beyond them lie slips of the pen."""

_LINE = re.compile(r"#\s*repulsion\s([^=]+=.*)")
_TERM = re.compile(
    r"\s*([A-Za-z]+)\s*-\s*([A-Za-z]+)\s*=\s*(\S+)\s+eV\s*,\s*(\S+)\s+per_A\s*,\s*(\S+)\s+to\s+(\S+)\s+A\s*,"
    r"([^,]+),(.+),([^,]+)"
)


def is_repulsion(text: str) -> bool:
    """Return whether a line at the head of a table states a two-body term."""
    return _LINE.fullmatch(text) is not None


def parse_repulsion(lines: Sequence[tuple[int, str]], faults: FaultList) -> dict[str, PairRepulsion]:
    """Two-body terms by their label, from numbered lines; what is wrong with them goes to the faults."""
    terms: dict[str, PairRepulsion] = {}
    first_line: dict[str, int] = {}
    for line, text in lines:
        term = _term(line, text, faults)
        if term is None:
            continue
        if term.label in terms:
            faults.add(line, f"the repulsion of {term.label} is given twice: keep one (line {first_line[term.label]})")
        terms[term.label] = term
        first_line[term.label] = line
    order = {symbol: place for place, symbol in enumerate(atom_symbols())}
    return {t.label: t for t in sorted(terms.values(), key=lambda t: (order[t.first], order[t.second]))}


def repulsion_line(term: PairRepulsion) -> str:
    """Return the line that reads back to an equal term."""
    return (
        f"# repulsion {term.label} = {term.amplitude_eV!r} eV, {term.decay_per_A!r} per_A, "
        f"{term.lowest_A!r} to {term.highest_A!r} A, {term.source_key}, {term.locator}, {term.provenance}"
    )


def _term(line: int, text: str, faults: FaultList) -> PairRepulsion | None:
    head = _LINE.fullmatch(text)
    match = _TERM.fullmatch(head[1]) if head else None
    if match is None:
        faults.add(line, f"{shown(text)} is no repulsion of a pair: write {EXAMPLE}")
        return None
    known = atom_symbols()
    pair = match[1], match[2]
    for symbol in pair:
        if symbol not in known:
            faults.add(line, f"{shown(symbol)} is no element from H to Cm: correct the symbol")
            return None
    first, second = sorted(pair, key=known.index, reverse=True)
    what = f"repulsion of {first}-{second}"
    amplitude, decay, lowest, highest = (number(match[k], what, line, faults) for k in range(3, 7))
    if not 0 < abs(amplitude) <= LARGEST_EV or not 0 < decay <= LARGEST_PER_A:
        faults.add(
            line, f"{what}: {shown(match[3])} eV, {shown(match[4])} per_A: give an amplitude and a positive decay"
        )
    if not 0 < lowest < highest <= LARGEST_A:
        faults.add(line, f"{what}: {shown(match[5])} to {shown(match[6])} A is no range: give the shorter length first")
    source, locator, provenance = (match[k].strip() for k in (7, 8, 9))
    if provenance not in get_args(Provenance):
        faults.add(line, f"{what}: {shown(provenance)} at the end: write {', '.join(get_args(Provenance))}")
    return PairRepulsion(
        first,
        second,
        amplitude,
        decay,
        lowest,
        highest,
        plain_text(source, "source_key", line, faults),
        plain_text(locator, "locator", line, faults),
        provenance,  # type: ignore[arg-type]
    )
