"""The cross-check as a JSON document; README describes its fields."""

from __future__ import annotations

import json
import math
from collections.abc import Sequence
from typing import Any

from ehmo import __version__
from ehmo.records.crosscheck import (
    BondComparison,
    BondNumbers,
    Crosscheck,
    FrontierLevel,
    LadderComparison,
    LadderStep,
)
from ehmo.report.cautions import CAUTIONS

SCHEMA = "ehmo crosscheck 1"
"""Name and version of the document; the version rises when a field changes its meaning."""


def crosscheck_document(found: Crosscheck) -> dict[str, Any]:
    """Both sides and the verdicts as plain data.

    Parameters
    ----------
    found : Crosscheck

    Returns
    -------
    document : dict
        Ready for `json.dumps`; NaN is None.
    """
    report, run = found.report, found.run
    return {
        "schema": SCHEMA,
        "program_version": __version__,
        "fragment": {
            "source": report.fragment.source,
            "title": report.fragment.title,
            "formula": report.fragment.formula,
            "charge": report.fragment.charge,
            "unpaired_electrons": report.fragment.unpaired_electrons,
        },
        "method": {
            "parameter_set": report.method.parameter_set,
            "parameter_edition": report.method.edition,
            "parameter_sha256": report.method.parameter_sha256,
            "charge_model": report.method.charge_model,
            "lambda": report.method.lambda_,
        },
        "run": {
            "program": run.program,
            "recipe": run.recipe,
            "theory": run.theory,
            "functions": len(run.basis),
            "input_sha256": run.key,
            "from_cache": run.from_cache,
            "energy_hartree": run.energy_hartree,
            "spin_squared": run.spin_squared,
            "tried": list(run.tried),
            "doubts": list(run.doubts),
        },
        "atoms": [
            {
                "label": label,
                "mulliken_charge": {"ehmo": ours.charge, "reference": theirs.charge},
                "spin_population": {"ehmo": ours.spin, "reference": theirs.spin},
            }
            for label, (ours, theirs) in zip(report.fragment.labels, found.atoms, strict=True)
        ],
        "bonds": [_bond(found, comparison) for comparison in found.bonds],
        "ladders": [_ladder(ladder) for ladder in found.ladders],
        "frontier": {
            "same_highest_filled": found.frontier.same_highest_filled,
            "same_lowest_empty": found.frontier.same_lowest_empty,
            "levels": {
                "ehmo": [_level(level) for level in found.frontier.ours],
                "reference": [_level(level) for level in found.frontier.reference],
            },
        },
        "cautions": list(CAUTIONS),
    }


def crosscheck_json(found: Sequence[Crosscheck]) -> str:
    """JSON text of one cross-check, or of several as ``{"schema", "crosschecks"}``."""
    documents = [crosscheck_document(one) for one in found]
    whole = documents[0] if len(documents) == 1 else {"schema": SCHEMA, "crosschecks": documents}
    return json.dumps(whole, indent=1, ensure_ascii=False, allow_nan=False) + "\n"


def _bond(found: Crosscheck, comparison: BondComparison) -> dict[str, Any]:
    bond, verdict = comparison.bond, comparison.verdict
    return {
        "metal": bond.metal,
        "donor": bond.donor,
        "label": found.report.bond_label(bond),
        "kind": str(bond.kind),
        "length_A": bond.length_A,
        "numbers": {"ehmo": _numbers(comparison.ours), "reference": _numbers(comparison.reference)},
        "verdict": verdict.kind,
        "verdict_words": verdict.words,
        "mayer_difference": verdict.mayer_difference,
        "reasons": list(verdict.reasons),
    }


def _numbers(numbers: BondNumbers) -> dict[str, Any]:
    return {
        "overlap_population": numbers.overlap_population,
        "mayer": numbers.mayer,
        "wiberg": numbers.wiberg,
        "channels": [{"type": channel.type, "weight": channel.weight} for channel in numbers.channels],
    }


def _ladder(ladder: LadderComparison) -> dict[str, Any]:
    return {
        "metal": ladder.metal,
        "shell": ladder.shell or None,
        "levels": {
            "ehmo": [_step(step) for step in ladder.ours],
            "reference": [_step(step) for step in ladder.reference],
        },
        "swapped": [list(pair) for pair in ladder.swapped],
        "withheld": list(ladder.withheld),
    }


def _step(step: LadderStep) -> dict[str, Any]:
    return {
        "label": step.label,
        "above_lowest_eV": step.above_lowest_eV,
        "electrons": step.electrons,
        "shell_share": step.shell_share,
    }


def _level(level: FrontierLevel) -> dict[str, Any]:
    return {
        "irrep": level.irrep or None,
        "irrep_share": None if math.isnan(level.irrep_share) else level.irrep_share,
        "degeneracy": level.degeneracy,
        "energy_eV": level.energy_eV,
        "electrons": level.electrons,
        "shell_share": level.shell_share,
    }
