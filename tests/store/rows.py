"""Rows to store: real reports, and cheap variations of them."""

from __future__ import annotations

import copy
import hashlib
from functools import cache
from typing import Any

import ehmo
from ehmo.report.document import bond_document
from ehmo.store import Provenance, StoredRow
from tests.geometries import SPECIES


def key(number: int) -> str:
    return hashlib.sha256(str(number).encode()).hexdigest()


@cache
def document(species: str = "[VO(OH2)5]2+") -> dict[str, Any]:
    """Full record of a species."""
    return bond_document(ehmo.bond_report(SPECIES[species].fragment()))


def provenance(**changes: Any) -> Provenance:
    usual = {
        "source": "a.xyz",
        "entry": "",
        "tags": ("first", "second"),
        "program_version": ehmo.__version__,
        "document_schema": "ehmo bond report 1",
        "results_edition": 1,
        "parameter_set": "standard",
        "parameter_sha256": "0" * 64,
        "platform": "Linux x86_64, Python 3.11, numpy 2.4",
        "started_utc": "2026-12-01T12:00:00Z",
        "duration_s": 0.01,
    }
    return Provenance(**(usual | changes))


def done(number: int, species: str = "[VO(OH2)5]2+", **changes: Any) -> StoredRow:
    """Done row; each number has its own title, so that rows can be told apart."""
    whole = copy.deepcopy(document(species))
    whole["fragment"]["title"] = f"structure {number}"
    return StoredRow(key(number), "done", "", whole, provenance(**changes))


def failed(number: int, message: str = "no metal; give a complex", **changes: Any) -> StoredRow:
    return StoredRow(key(number), "failed", message, None, provenance(**changes))
