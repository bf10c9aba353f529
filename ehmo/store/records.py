"""One row of the store, and where it comes from."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Literal

DONE: Literal["done"] = "done"
FAILED: Literal["failed"] = "failed"

_KEY = re.compile("[0-9a-f]{64}")


@dataclass(frozen=True, slots=True)
class Provenance:
    """Where a row comes from and what made it.

    Attributes
    ----------
    source : str
        Path or name of the structure, as it was given.
    entry : str
        Frame, block or molecule within the source; empty if it holds one structure.
    tags : tuple of str
        Words that the user put on the structure.
    program_version, document_schema : str
        What made the row, and the form of its document.
    results_edition : int
        Rises whenever numbers change.
    parameter_set, parameter_sha256 : str
        Parameter set and the hash of its content.
    platform : str
        Operating system, processor, versions of Python and numpy.
    started_utc : str
        Start of the calculation, ISO 8601.
    duration_s : float
        Time the calculation took [s].
    """

    source: str
    entry: str
    tags: tuple[str, ...]
    program_version: str
    document_schema: str
    results_edition: int
    parameter_set: str
    parameter_sha256: str
    platform: str
    started_utc: str
    duration_s: float


@dataclass(frozen=True, slots=True)
class StoredRow:
    """Outcome of one calculation.

    Attributes
    ----------
    key : str
        SHA-256 of the input, 64 hexadecimal digits.
    status : "done" or "failed"
    message : str
        Why it failed; empty if it is done.
    document : mapping or None
        Full report as plain data, as `json.dumps` takes it; None if it failed.
    provenance : Provenance
    """

    key: str
    status: Literal["done", "failed"]
    message: str
    document: Mapping[str, Any] | None
    provenance: Provenance

    def __post_init__(self) -> None:
        if not _KEY.fullmatch(self.key):
            raise ValueError(f"a key is a SHA-256 in lower-case hexadecimal, not {self.key[:80]!r}")
        if self.status not in (DONE, FAILED):
            raise ValueError(f"status is {DONE!r} or {FAILED!r}, not {self.status!r}")
        if (self.document is None) == (self.status == DONE):
            raise ValueError("a done row has a document, a failed one has none")
