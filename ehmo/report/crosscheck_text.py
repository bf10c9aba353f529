"""The cross-check as text for a terminal."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from typing import Final

from ehmo.errors import visible
from ehmo.records.crosscheck import BondComparison, Crosscheck, FrontierLevel, LadderComparison, Theory
from ehmo.records.table import aligned
from ehmo.records.wording import channel_weights, electrons_in_words
from ehmo.report.cautions import CAUTIONS
from ehmo.report.text import WIDTH, sentence_lines

THEORY_NAMES: Final[dict[Theory, str]] = {"pbe": "PBE", "b3lyp": "B3LYP", "hf": "HF"}

READING: Final = (
    "Minimal-basis figures are a second opinion, not the truth: both methods can be wrong together.",
    "Overlap populations take the highest s, p, d (f block: f) shell of the metal only, on both sides.",
)


def crosscheck_text(found: Crosscheck) -> str:
    """Both sides and the verdicts as text.

    Parameters
    ----------
    found : Crosscheck

    Returns
    -------
    text : str
        Lines of at most about 100 characters.
    """
    sections = [
        _heading(found),
        _verdicts(found),
        _bonds(found),
        _channels(found),
        _charges(found),
        *(_ladder(found, ladder) for ladder in found.ladders),
        _frontier(found),
        sentence_lines("To bear in mind", [*found.run.doubts, *READING]),
        sentence_lines("Cautions", CAUTIONS),
    ]
    return "\n\n".join("\n".join(section) for section in sections if section) + "\n"


def _heading(found: Crosscheck) -> list[str]:
    report = found.report
    method = report.method
    lines = [
        visible(report.fragment.source) or "fragment",
        f"{report.fragment.formula}, {electrons_in_words(report.fragment)}",
        f"ehmo: set {visible(method.parameter_set)} ({visible(method.edition)}), {method.charge_model} charges",
    ]
    return [*lines, *textwrap.wrap(run_in_words(found), WIDTH, subsequent_indent="  ")]


def run_in_words(found: Crosscheck) -> str:
    """Program, basis and tries of the run."""
    run = found.run
    return (
        f"{THEORY_NAMES[run.theory]}: {run.program}, minimal contraction of ANO-RCC ({len(run.basis)} functions), "
        f"spin-free X2C, density fitting{', from the cache' if run.from_cache else ''}; {'; '.join(run.tried)}"
    )


def _verdicts(found: Crosscheck) -> list[str]:
    lines = [
        line
        for said in verdict_sentences(found)
        for line in textwrap.wrap(said, WIDTH, initial_indent="  ", subsequent_indent="    ")
    ]
    return ["Verdict on each bond", *lines]


def verdict_sentences(found: Crosscheck) -> list[str]:
    """One sentence on each bond."""
    sentences = []
    for place, comparison in enumerate(found.bonds):
        said = f"{_label(found, comparison)}: {comparison.verdict.words}"
        # Doubts stand in the words already; what follows are the figures.
        rest = [reason for reason in comparison.verdict.reasons if reason not in comparison.verdict.words]
        same = next(
            (other for other in found.bonds[:place] if _same_figures(other, comparison)),
            None,
        )
        said += f" (as {_label(found, same)})" if same else f" ({'; '.join(rest)})" if rest else ""
        sentences.append(said)
    return sentences


def _same_figures(one: BondComparison, other: BondComparison) -> bool:
    return one.verdict.reasons == other.verdict.reasons and one.verdict.words == other.verdict.words


def _label(found: Crosscheck, comparison: BondComparison) -> str:
    return found.report.bond_label(comparison.bond)


def _bonds(found: Crosscheck) -> list[str]:
    return ["Bonds", *aligned(comparison_rows(found), numeric=range(2, 9), indent="  ")]


def comparison_rows(found: Crosscheck) -> list[list[str]]:
    """Heading, and orders of both sides for each bond."""
    name = THEORY_NAMES[found.run.theory]
    rows: list[list[str]] = [
        [
            *("bond", "kind", "length/Å", "Mayer ehmo", name),
            *("Wiberg ehmo", name, "overlap pop. ehmo", name),
        ]
    ]
    for comparison in found.bonds:
        ours, theirs = comparison.ours, comparison.reference
        pairs = (
            (ours.mayer, theirs.mayer),
            (ours.wiberg, theirs.wiberg),
            (ours.overlap_population, theirs.overlap_population),
        )
        rows.append(
            [
                _label(found, comparison),
                comparison.bond.kind,
                f"{comparison.bond.length_A:.3f}",
                *(f"{value:.2f}" for pair in pairs for value in pair),
            ]
        )
    return rows


def _channels(found: Crosscheck) -> list[str]:
    return ["Channels and their weights", *aligned(channel_comparison_rows(found), indent="  ")]


def channel_comparison_rows(found: Crosscheck) -> list[list[str]]:
    """Heading, and channel weights of both sides for each bond."""
    rows = [["bond", "ehmo", THEORY_NAMES[found.run.theory]]]
    rows += [
        [
            _label(found, comparison),
            channel_weights(comparison.ours.channels),
            channel_weights(comparison.reference.channels),
        ]
        for comparison in found.bonds
    ]
    return rows


def _charges(found: Crosscheck) -> list[str]:
    rows = charge_comparison_rows(found)
    return ["Mulliken charges of metals and donors", *aligned(rows, numeric=range(1, 5), indent="  ")]


def charge_comparison_rows(found: Crosscheck) -> list[list[str]]:
    """Heading, and charges of both sides for each metal and donor."""
    report, name = found.report, THEORY_NAMES[found.run.theory]
    unpaired = bool(report.fragment.unpaired_electrons)
    rows = [["atom", "charge/e ehmo", name, *(["unpaired/e ehmo", name] if unpaired else [])]]
    for atom in sorted({*report.coordination.metals, *(bond.donor for bond in report.coordination.bonds)}):
        ours, theirs = found.atoms[atom]
        row = [report.fragment.labels[atom], f"{ours.charge:+.2f}", f"{theirs.charge:+.2f}"]
        rows.append([*row, f"{ours.spin:.2f}", f"{theirs.spin:.2f}"] if unpaired else row)
    return rows


def _ladder(found: Crosscheck, ladder: LadderComparison) -> list[str]:
    label = found.report.fragment.labels[ladder.metal]
    lines: list[str] = []
    if ladder.ours or ladder.reference:
        rows = [["ehmo", "eV", f"{ladder.shell}/%", THEORY_NAMES[found.run.theory], "eV", f"{ladder.shell}/%"]]
        height = max(len(ladder.ours), len(ladder.reference))
        for place in reversed(range(height)):
            row: list[str] = []
            for side in (ladder.ours, ladder.reference):
                step = side[place] if side else None
                row += (
                    ["-", "", ""]
                    if step is None
                    else [step.label, f"{step.above_lowest_eV:.2f}", f"{100 * step.shell_share:.0f}"]
                )
            rows.append(row)
        lines = [f"Ladder of {label}, topmost first", *aligned(rows, numeric=(1, 2, 4, 5), indent="  ")]
        if ladder.ours and ladder.reference:
            order = "; ".join(f"{low} lies below {high} in ehmo, above it in the run" for low, high in ladder.swapped)
            lines.append(f"  Order: {order or 'the same, as far as the levels are clearly apart'}")
    said = [*([] if lines else [f"No ladder of {label}"]), *(f"  {reason}" for reason in ladder.withheld)]
    return [*lines, *said]


def _frontier(found: Crosscheck) -> list[str]:
    frontier = found.frontier
    shell = next((ladder.shell for ladder in found.ladders if ladder.shell), "d")
    name = THEORY_NAMES[found.run.theory]
    columns = ("eV", "electrons", f"{shell}/%")
    rows = [["ehmo", *columns, name, *columns]]
    ours, theirs = _by_place(frontier.ours), _by_place(frontier.reference)
    rows += [
        [cell for side in (ours, theirs) for cell in _level_cells(side.get(place))]
        for place in sorted({*ours, *theirs}, reverse=True)
    ]
    lines = [
        "Frontier orbitals, topmost first (energies from the highest that holds electrons)",
        *aligned(rows, numeric=(1, 2, 3, 5, 6, 7), indent="  "),
    ]
    if frontier.same_highest_filled is not None:
        lines += [
            f"  Highest filled: {_agreement(frontier.same_highest_filled)}",
            f"  Lowest empty: {_agreement(frontier.same_lowest_empty)}",
        ]
    return lines


def _agreement(same: bool | None) -> str:
    return "the same irrep" if same else "different irreps"


def _by_place(levels: Sequence[FrontierLevel]) -> dict[int, FrontierLevel]:
    """Levels counted from the highest one that holds electrons."""
    highest = max((place for place, level in enumerate(levels) if level.electrons > 0.1), default=0)
    return {place - highest: level for place, level in enumerate(levels)}


def _level_cells(level: FrontierLevel | None) -> list[str]:
    if level is None:
        return ["", "", "", ""]
    label = level.irrep or ("-" if level.degeneracy == 1 else f"set of {level.degeneracy}")
    return [label, f"{level.energy_eV:.2f}", f"{round(level.electrons, 1):g}", f"{100 * level.shell_share:.0f}"]
