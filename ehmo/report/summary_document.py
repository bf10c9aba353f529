"""The summary of a store as a JSON document; README describes its fields."""

from __future__ import annotations

import json
from dataclasses import asdict
from typing import Any

from ehmo import __version__
from ehmo.records.store_summary import StoreSummary
from ehmo.store.distributions import FENCE, LEAST_BONDS, LEAST_RANGES

SCHEMA = "ehmo store summary 1"
"""Name and version of the document; the version rises when a field changes its meaning."""


def summary_document(summary: StoreSummary) -> dict[str, Any]:
    """Summary as plain data.

    Parameters
    ----------
    summary : StoreSummary

    Returns
    -------
    document : dict
        Ready for `json.dumps`.
    """
    fields = asdict(summary)
    rule = {"interquartile_ranges": FENCE, "least_bonds": LEAST_BONDS, "least_interquartile_range": dict(LEAST_RANGES)}
    kinds = [one | one.pop("distributions") for one in fields.pop("kinds")]
    return {
        "schema": SCHEMA,
        "program_version": __version__,
        **fields,
        "outlier_rule": rule,
        "kinds": kinds,
    }


def summary_json(summary: StoreSummary) -> str:
    """Summary as JSON text."""
    return json.dumps(summary_document(summary), indent=1, allow_nan=False) + "\n"
