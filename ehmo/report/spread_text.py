"""How far the numbers of a report move with the parameters, as text for a terminal."""

from __future__ import annotations

import textwrap

from ehmo.records.report import BondReport
from ehmo.records.spread import BondSpread, ParameterEffect, Spread, UncertainParameter
from ehmo.records.table import aligned

WIDTH = 100
_EFFECTS = 4
_WORTH_SAYING = 0.005


def draw_lines(report: BondReport) -> list[str]:
    """Draws behind the standard deviations; empty for a report without spread."""
    if report.spread is None:
        return []
    return ["Spread (± is one standard deviation)", *_wrapped(draws_in_words(report.spread))]


def spread_lines(report: BondReport) -> list[str]:
    """Draws behind the standard deviations, and the parameters that move each Mayer order most.

    Parameters
    ----------
    report : BondReport

    Returns
    -------
    lines : list of str
        Empty for a report without spread.
    """
    spread = report.spread
    if spread is None:
        return []
    rows, sizes = effect_rows(report)
    if not rows:
        return draw_lines(report)
    return [
        *draw_lines(report),
        "  What moves the Mayer orders most, with one standard deviation of one parameter",
        *aligned(rows, indent="    "),
        *_wrapped(sizes),
    ]


def effect_rows(report: BondReport) -> tuple[list[list[str]], str]:
    """For each bond the parameters that move its Mayer order most, and their standard deviations in words."""
    if report.spread is None:
        return [], ""
    shown = [_largest(own) for own in report.spread.bonds]
    rows = [
        [report.bond_label(bond), *(f"{effect.parameter} {effect.mayer_per_sd:+.2f}" for effect in effects)]
        for bond, effects in zip(report.coordination.bonds, shown, strict=True)
    ]
    width = max((len(row) for row in rows), default=0)
    if width < 2:
        return [], ""
    named = {effect.parameter for effects in shown for effect in effects}
    sizes = [_size_in_words(parameter) for parameter in report.spread.parameters if parameter.name in named]
    return [row + [""] * (width - len(row)) for row in rows], f"Standard deviations: {', '.join(sizes)}"


def _largest(spread: BondSpread) -> list[ParameterEffect]:
    return [effect for effect in spread.sensitivity[:_EFFECTS] if abs(effect.mayer_per_sd) >= _WORTH_SAYING]


def draws_in_words(spread: Spread) -> str:
    """How many draws there were, and what became of them."""
    lost = [
        f"{count} {reason}"
        for count, reason in (
            (spread.indefinite_overlap, "with an indefinite overlap matrix"),
            (spread.unsettled, "whose charges did not settle"),
            (spread.other_configuration, "with another filling of the ladder"),
        )
        if count
    ]
    left_out = f"; left out: {', '.join(lost)}" if lost else ""
    defaults = [parameter for parameter in spread.parameters if not parameter.stated]
    assumed = (
        ""
        if not defaults
        else f"; the table states no standard deviation of {len(defaults)} of {len(spread.parameters)} parameters, "
        "usual ones taken"
    )
    used = f"{spread.used} of {spread.draws} draws of h_ii, exponents and constants (seed {spread.seed})"
    return f"{used}{left_out}{assumed}"


def _size_in_words(parameter: UncertainParameter) -> str:
    unit = {"bohr^-1": " bohr⁻¹", "1/A": " Å⁻¹", "eV": " eV"}.get(parameter.unit, "")
    return f"{parameter.name} {parameter.sd:.2g}{unit}"


def _wrapped(text: str) -> list[str]:
    return textwrap.wrap(text, WIDTH, initial_indent="  ", subsequent_indent="    ")
